import request from 'supertest'
import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest'
import { Problem } from '../../../src/shared/contract/errors.ts'
import { PERMISSIONS, Role } from '../../../src/shared/contract/permissions.ts'
import { API, ROUTES } from '../../../src/shared/contract/routes.ts'
import type { Access, RouteContract, RouteKey } from '../../../src/shared/contract/routes.ts'
import type { Handlers } from '../../../server/http/registry.ts'
import { addPerson, addressOf, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

/** Every route answers by telling that it was reached; sign-in itself stays real. */
const reached: RouteKey[] = []
const keys = Object.keys(ROUTES) as RouteKey[]
const watched = keys.filter((key) => key !== 'auth.signIn')
const handlers = Object.fromEntries(
  watched.map((key) => [
    key,
    () => {
      reached.push(key)
      return Promise.resolve({})
    },
  ]),
) as Partial<Handlers>

let test: TestApp
const agents = new Map<Role, Awaited<ReturnType<typeof signedInAgent>>>()

beforeAll(async () => {
  // The stubs' answers are not what the contract promises, which only a demo checks.
  test = await createTestApp({ handlers, env: { EVENSTRUNG_MODE: 'production' } })
  for (const role of Role.options) {
    const { email } = await addPerson(test, [role])
    agents.set(role, await signedInAgent(test.app, email))
  }
})
afterAll(() => test.close())
beforeEach(() => {
  reached.length = 0
})

function mayEnter(role: Role, access: Access): boolean {
  return access === 'public' || access === 'signedIn' || PERMISSIONS[access].includes(role)
}

const routes: [RouteKey, RouteContract][] = watched.map((key) => [key, ROUTES[key]])

describe.each(routes)('%s', (key, route) => {
  const address = addressOf(key)

  it.each(Role.options)('lets %s in or keeps them out as the permission table says', async (role) => {
    const response = await agents
      .get(role)!
      [route.method](address)
      .send(route.method === 'get' ? undefined : {})
    if (mayEnter(role, route.access)) {
      // The empty body may not be what the route wants: that is refused after the access check.
      expect(response.status === 400 ? Problem.parse(response.body).code : 'reached').toMatch(
        /^(reached|request\.invalid|password\.weak)$/,
      )
      if (response.status !== 400) expect(reached).toEqual([key])
    } else {
      expect(response.status).toBe(403)
      expect(Problem.parse(response.body).code).toBe('permission.denied')
      expect(reached).toEqual([])
    }
  })

  it('keeps out whoever is not signed in, unless it is public', async () => {
    const response = await request(test.app)
      [route.method](address)
      .send(route.method === 'get' ? undefined : {})
    if (route.access === 'public') expect([200, 201, 400]).toContain(response.status)
    else {
      expect(response.status).toBe(401)
      expect(Problem.parse(response.body).code).toBe('sign-in.required')
      expect(reached).toEqual([])
    }
  })

  if (route.method !== 'get')
    it('refuses a write from another site, whoever is signed in', async () => {
      const response = await agents
        .get('admin')!
        [route.method](address)
        .set('Origin', 'https://elsewhere.example')
        .send({})
      expect(response.status).toBe(403)
      expect(Problem.parse(response.body).code).toBe('request.origin')
      expect(reached).toEqual([])
    })
})

describe('routes that the test above leaves to others', () => {
  it('is sign-in alone, which is public', () => {
    expect(keys.filter((key) => !(watched as RouteKey[]).includes(key))).toEqual(['auth.signIn'])
    expect(ROUTES['auth.signIn'].access).toBe('public')
  })

  it('refuses a sign-in from another site too', async () => {
    const response = await request(test.app)
      .post(addressOf('auth.signIn'))
      .set('Origin', 'https://elsewhere.example')
      .send({ email: 'a', password: 'b' })
      .expect(403)
    expect(Problem.parse(response.body).code).toBe('request.origin')
  })

  it('answers an address that no route has with route.unknown', async () => {
    const response = await request(test.app).get(`${API}/nothing-here`).expect(404)
    expect(Problem.parse(response.body).code).toBe('route.unknown')
  })
})
