import { Validator } from '@seriousme/openapi-schema-validator'
import { describe, expect, it } from 'vitest'
import { ROUTES } from '../../src/shared/contract/routes.ts'
import type { RouteContract } from '../../src/shared/contract/routes.ts'
import { STATUS_OF } from '../../server/errors.ts'
import { createOpenApi, errorsOf } from '../../server/openapi.ts'

interface Parameter {
  name: string
  in: string
  required: boolean
  schema: Record<string, unknown>
}
interface Operation {
  operationId: string
  parameters: Parameter[]
  responses: Record<string, unknown>
  security: unknown
  'x-access': string
}
interface Document {
  openapi: string
  info: { version: string }
  paths: Record<string, Record<string, Operation>>
  components: { schemas: Record<string, Record<string, unknown>> }
}

const document = JSON.parse(JSON.stringify(createOpenApi('1.2.3'))) as Document
const routes = Object.entries(ROUTES) as [string, RouteContract][]
const operations = Object.entries(document.paths).flatMap(([path, methods]) =>
  Object.entries(methods).map(([method, operation]) => ({ path, method, operation })),
)

describe('createOpenApi()', () => {
  it('is a valid OpenAPI 3.1 document by the published schema', async () => {
    const result = await new Validator().validate({ ...structuredClone(document) })
    expect(result.errors).toBeUndefined()
    expect(result.valid).toBe(true)
    expect(document.openapi).toBe('3.1.0')
    expect(document.info.version).toBe('1.2.3')
  })

  it('has one operation for each route, under its method and address', () => {
    expect(operations.map(({ operation }) => operation.operationId).toSorted()).toEqual(
      Object.keys(ROUTES).toSorted(),
    )
    for (const [key, route] of routes) {
      const found = operations.find(({ operation }) => operation.operationId === key)!
      expect(found.method).toBe(route.method)
      expect(found.path).toBe(route.path.replace(/:(\w+)/g, '{$1}'))
    }
  })

  it('names every parameter that an address holds', () => {
    for (const { path, operation } of operations) {
      const inPath = [...path.matchAll(/\{(\w+)\}/g)].map(([, name]) => name)
      const named = operation.parameters.filter((parameter) => parameter.in === 'path')
      expect(named.map((parameter) => parameter.name)).toEqual(inPath)
    }
  })

  it('lists the status of every code that a route can give', () => {
    for (const [key, route] of routes) {
      const { operation } = operations.find((candidate) => candidate.operation.operationId === key)!
      const listed = Object.keys(operation.responses)
      for (const code of errorsOf(route)) expect(listed).toContain(String(STATUS_OF[code]))
      expect(listed).toContain(String(route.status))
    }
  })

  it('refers only to schemas that it holds, and holds none that says nothing', () => {
    const held = document.components.schemas
    const refs = [...JSON.stringify(document).matchAll(/"\$ref":"#\/components\/schemas\/([^"]+)"/g)]
    expect(refs.length).toBeGreaterThan(50)
    for (const [, name] of refs) expect(held).toHaveProperty([name!])
    for (const [name, schema] of Object.entries(held))
      expect([name, Object.keys(schema).length]).not.toEqual([name, 0])
  })

  it('says what a query is by default and that a password is wanted', () => {
    const list = document.paths['/instruments']!.get!
    const limit = list.parameters.find(({ name }) => name === 'limit')
    expect(limit).toMatchObject({ in: 'query', required: false, schema: { default: 25, maximum: 100 } })
    const signIn = document.components.schemas['SignIn.Input']!
    expect(signIn.required).toEqual(['email', 'password'])
  })

  it('says of each route whether it needs a sign-in', () => {
    for (const [key, route] of routes) {
      const { operation } = operations.find((candidate) => candidate.operation.operationId === key)!
      expect(operation.security).toEqual(route.access === 'public' ? [] : [{ signIn: [] }])
      expect(operation['x-access']).toBe(route.access)
    }
  })
})
