import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import path from 'node:path'
import { Writable } from 'node:stream'
import request from 'supertest'
import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest'
import { Problem } from '../../../src/shared/contract/errors.ts'
import { API } from '../../../src/shared/contract/routes.ts'
import { TOKEN_COOKIE, REFRESH_COOKIE } from '../../../server/auth/cookies.ts'
import { createLog } from '../../../server/log.ts'
import { PASSWORD, addPerson, createTestApp, setCookie, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let logged = ''
const log = createLog(
  { logLevel: 'debug' },
  new Writable({
    write(chunk, _encoding, done) {
      logged += String(chunk)
      done()
    },
  }),
)

const clientDir = mkdtempSync(path.join(tmpdir(), 'evenstrung-client-'))
mkdirSync(path.join(clientDir, 'assets'))
writeFileSync(path.join(clientDir, 'index.html'), '<!doctype html><div id="app"></div>')
writeFileSync(path.join(clientDir, 'assets', 'index-0a1b2c3d.js'), 'export {}')

let test: TestApp
beforeAll(async () => {
  test = await createTestApp({
    log,
    env: { CLIENT_DIR: clientDir },
    handlers: {
      'protocol.read': () => Promise.reject(new Error('secret words of the inside')),
      'models.list': () => Promise.resolve({ items: [{ id: 'not what was promised' }] } as never),
    },
  })
})
afterAll(async () => {
  await test.close()
  rmSync(clientDir, { recursive: true })
})
beforeEach(() => {
  logged = ''
})

describe('headers', () => {
  it('allow scripts of the own origin only, neither inline nor evaluated', async () => {
    const { headers } = await request(test.app).get('/').set('Accept', 'text/html').expect(200)
    const policy = new Map(
      headers['content-security-policy']!.split(';').map((part) => {
        const [name, ...values] = part.trim().split(' ')
        return [name!, values] as const
      }),
    )
    expect(policy.get('script-src')).toEqual(["'self'"])
    expect(policy.get('default-src')).toEqual(["'none'"])
    expect(policy.get('connect-src')).toEqual(["'self'"])
    expect(policy.get('frame-ancestors')).toEqual(["'none'"])
    expect(policy.get('style-src')).toEqual(["'self'"])
    expect(headers['content-security-policy']).not.toContain('unsafe-eval')
    expect(headers['x-content-type-options']).toBe('nosniff')
    expect(headers['x-powered-by']).toBeUndefined()
    expect(headers['strict-transport-security']).toBeUndefined()
  })

  it('demand https everywhere when the public address is https', async () => {
    const secure = await createTestApp({ env: { PUBLIC_URL: 'https://bench.harrowlane.test/' } })
    const { email } = await addPerson(secure, ['installer'])
    const response = await request(secure.app)
      .post(`${API}/auth/sign-in`)
      .set('Origin', 'https://bench.harrowlane.test')
      .send({ email, password: PASSWORD })
      .expect(200)
    for (const line of response.headers['set-cookie'] as unknown as string[])
      expect(line).toContain('; Secure')
    expect(response.headers['strict-transport-security']).toContain('max-age=')
    await secure.close()
  })

  it('keep answers of the API out of every cache', async () => {
    const { headers } = await request(test.app).get(`${API}/health`).expect(200)
    expect(headers['cache-control']).toBe('no-store')
  })
})

describe('files of the page', () => {
  it('serves hashed files for a year and the page itself never from a cache', async () => {
    const asset = await request(test.app).get('/assets/index-0a1b2c3d.js').expect(200)
    expect(asset.headers['cache-control']).toBe('public, max-age=31536000, immutable')
    const page = await request(test.app).get('/').set('Accept', 'text/html').expect(200)
    expect(page.headers['cache-control']).toBe('no-cache')
    expect(page.text).toContain('id="app"')
  })

  it('gives the page for every address that its router may know', async () => {
    for (const address of ['/check', '/runs/0b8f7d1e', '/invite/abc'])
      expect((await request(test.app).get(address).set('Accept', 'text/html').expect(200)).text).toContain(
        'app',
      )
  })

  it('answers 404 for files that are not there, unknown routes and other methods', async () => {
    for (const address of ['/assets/index-gone.js', '/robots.txt', '/api/v1/nothing', '/api/v2/health'])
      expect((await request(test.app).get(address).expect(404)).body.code).toBe('route.unknown')
    await request(test.app).delete('/check').expect(404)
    await request(test.app).delete(`${API}/health`).expect(404)
    await request(test.app).get('/../package.json').expect(404)
    await request(test.app).get('/%2e%2e/package.json').expect(404)
  })
})

describe('a refusal', () => {
  const signIn = () => request(test.app).post(`${API}/auth/sign-in`)

  it('is application/problem+json with code, remedy and the id that is in the log', async () => {
    const response = await request(test.app).get(`${API}/auth/me`).expect(401)
    expect(response.headers['content-type']).toBe('application/problem+json; charset=utf-8')
    const problem = Problem.parse(response.body)
    expect(problem).toMatchObject({ code: 'sign-in.required', status: 401 })
    expect(problem.type.endsWith(problem.code)).toBe(true)
    expect(problem.requestId).toBe(response.headers['x-request-id'])
    expect(logged).toContain(problem.requestId!)
  })

  it('names every field that is not right', async () => {
    const { body } = await signIn().send({ email: '' }).expect(400)
    expect(body.code).toBe('request.invalid')
    expect(body.fields.map(({ path: name }: { path: string }) => name)).toEqual(['email', 'password'])
  })

  it('tells broken JSON, another content type and a body that is too large apart', async () => {
    const broken = await signIn().set('Content-Type', 'application/json').send('{"email":').expect(400)
    expect(broken.body.code).toBe('request.malformed')
    const form = await signIn().type('form').send({ email: 'a', password: 'b' }).expect(400)
    expect(form.body.code).toBe('request.malformed')
    const large = await signIn()
      .send({ email: 'a', password: 'b'.repeat(300_000) })
      .expect(413)
    expect(large.body.code).toBe('request.too-large')
    const address = await request(test.app).get(`${API}/scan/%E0%A4%A`).expect(400)
    expect(address.body.code).toBe('request.malformed')
  })

  it('does not read the body of someone who is not signed in', async () => {
    const response = await request(test.app)
      .post(`${API}/cautions`)
      .set('Content-Type', 'application/json')
      .send('{"broken":')
      .expect(401)
    expect(response.body.code).toBe('sign-in.required')
  })

  it('tells nothing of the inside when something unexpected happens, and logs it under the same id', async () => {
    const response = await request(test.app).get(`${API}/bench-protocol.json`).expect(500)
    expect(response.body).toMatchObject({ code: 'server.error' })
    expect(response.text).not.toContain('secret words')
    const line = logged.split('\n').find((entry) => entry.includes('secret words'))!
    expect(JSON.parse(line)).toMatchObject({ level: 50, requestId: response.body.requestId })
  })

  it('comes instead of an answer that breaks the contract', async () => {
    const { email } = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, email)
    expect((await agent.get(`${API}/models`).expect(500)).body.code).toBe('server.error')
    expect(logged).toContain('answer of models.list breaks its contract')
    expect(logged).not.toContain('not what was promised')
  })

  it('is storage.away with 503 while the database does not answer', async () => {
    const away = await createTestApp()
    await away.knex.destroy()
    const { connect } = await import('../../../server/connect.ts')
    const nowhere = connect('mysql://nobody:x@127.0.0.1:9/nothing', 1)
    const { createHandlers } = await import('../../../server/handlers.ts')
    const { createApp } = await import('../../../server/app.ts')
    const { createSessions } = await import('../../../server/auth/sessions.ts')
    const { noRuns } = await import('../../helpers/testApp.ts')
    const { config, passwords, hub, clock } = away
    const sessions = createSessions(nowhere, config, clock.now)
    const handlers = createHandlers({
      config,
      knex: nowhere,
      sessions,
      passwords,
      hub,
      runs: noRuns,
      protocolSchema: {},
      about: { method: 1, version: '0' },
      now: clock.now,
    })
    const app = createApp({ config, handlers, sessions, log })
    const response = await request(app)
      .post(`${API}/auth/sign-in`)
      .send({ email: 'a', password: 'b' })
      .expect(503)
    expect(response.body.code).toBe('storage.away')
    const health = await request(app).get(`${API}/health`).expect(200)
    expect(health.body).toMatchObject({ ok: false, database: false })
    await nowhere.destroy()
    await away.close()
  })
})

describe('the log', () => {
  it('never holds passwords, tokens, cookies, names or addresses', async () => {
    const { email, name } = await addPerson(test, ['installer'])
    const signedIn = await request(test.app)
      .post(`${API}/auth/sign-in`)
      .send({ email, password: PASSWORD })
      .expect(200)
    const token = setCookie(signedIn, TOKEN_COOKIE)!
    const refreshToken = setCookie(signedIn, REFRESH_COOKIE)!
    await request(test.app).get(`${API}/auth/me`).set('Cookie', `${TOKEN_COOKIE}=${token}`).expect(200)
    await request(test.app)
      .post(`${API}/auth/refresh`)
      .set('Cookie', `${REFRESH_COOKIE}=${refreshToken}`)
      .expect(200)
    const inviteToken = 'one-time-'.padEnd(43, 'x')
    await request(test.app).get(`${API}/invites/${inviteToken}`).expect(410)
    expect(logged.match(/"msg":"answered"/g)).toHaveLength(4)
    expect(logged).toContain('"route":"auth.signIn"')
    for (const secret of [PASSWORD, token, refreshToken, inviteToken, email, name])
      expect(logged).not.toContain(secret)
  })

  it('keeps values of a failed statement out, which the driver puts into its message', async () => {
    const { describeError } = await import('../../../server/http/describeError.ts')
    const { email } = await addPerson(test, ['installer'])
    const failed = await test
      .knex('users')
      .insert({ id: 'x', name: 'y', email, created_at: test.clock.now() })
      .catch((error: unknown) => error)
    expect(String(failed)).toContain(email)
    const described = describeError(failed)
    expect(JSON.stringify(described)).not.toContain(email)
    expect(described.code).toBe('ER_DUP_ENTRY')
  })
})
