import { z } from 'zod'
import * as auth from '../src/shared/contract/auth.ts'
import * as errors from '../src/shared/contract/errors.ts'
import { ERRORS } from '../src/shared/contract/errors.ts'
import type { ErrorCode } from '../src/shared/contract/errors.ts'
import * as frames from '../src/shared/contract/frames.ts'
import * as measured from '../src/shared/contract/measured.ts'
import * as permissions from '../src/shared/contract/permissions.ts'
import * as quantities from '../src/shared/contract/quantities.ts'
import { API, ROUTES } from '../src/shared/contract/routes.ts'
import type { RouteContract, RouteKey } from '../src/shared/contract/routes.ts'
import * as rules from '../src/shared/contract/rules.ts'
import * as runs from '../src/shared/contract/runs.ts'
import * as simulation from '../src/shared/contract/simulation.ts'
import * as thresholds from '../src/shared/contract/thresholds.ts'
import * as workshop from '../src/shared/contract/workshop.ts'
import { TOKEN_COOKIE } from './auth/cookies.ts'
import { STATUS_OF } from './errors.ts'

type Json = Record<string, unknown>
type Direction = 'input' | 'output'

const EVERY_ROUTE: readonly ErrorCode[] = ['request.invalid', 'storage.away', 'server.error']
const WITH_ACCESS: readonly ErrorCode[] = ['sign-in.required', 'permission.denied']
const WITH_WRITE: readonly ErrorCode[] = ['request.origin']
const WITH_BODY: readonly ErrorCode[] = ['request.malformed', 'request.too-large']

const CONTRACT = {
  ...auth,
  ...errors,
  ...frames,
  ...measured,
  ...permissions,
  ...quantities,
  ...rules,
  ...runs,
  ...simulation,
  ...thresholds,
  ...workshop,
}

/** Schemas that the contract exports keep their names; those of a route are named after it. */
function namedSchemas(): z.core.$ZodRegistry<{ id: string }> {
  const registry = z.registry<{ id: string }>()
  for (const [name, value] of Object.entries(CONTRACT))
    if (value instanceof z.ZodType) registry.add(value, { id: name })
  for (const [key, route] of Object.entries(ROUTES) as [RouteKey, RouteContract][]) {
    const parts = { Params: route.params, Query: route.query, Body: route.body, Answer: route.answer }
    for (const [part, schema] of Object.entries(parts))
      if (schema && !registry.has(schema)) registry.add(schema, { id: `${key}${part}` })
  }
  return registry
}

/** What a client sends and what it gets differ (defaults, conversions), so each schema can stand twice. */
const componentName = (id: string, direction: Direction) => (direction === 'input' ? `${id}.Input` : id)
const refTo = (id: string, direction: Direction) => `#/components/schemas/${componentName(id, direction)}`

function convert(registry: z.core.$ZodRegistry<{ id: string }>, io: Direction): Record<string, Json> {
  const { schemas } = z.toJSONSchema(registry, {
    target: 'draft-2020-12',
    // What a conversion gives has no schema; such an answer is referred to by no route.
    unrepresentable: 'any',
    io,
    uri: (id) => refTo(id, io),
  })
  return Object.fromEntries(
    Object.entries(schemas).map(([id, schema]) => {
      const { $schema: _dialect, $id: _place, id: _id, ...rest } = schema as Json
      return [componentName(id, io), rest]
    }),
  )
}

/** Names that a piece of the document refers to, and those that these refer to. */
function reachable(from: unknown, schemas: Record<string, Json>, found = new Set<string>()): Set<string> {
  for (const [, name] of JSON.stringify(from).matchAll(/"\$ref":"#\/components\/schemas\/([^"]+)"/g)) {
    if (found.has(name!)) continue
    found.add(name!)
    reachable(schemas[name!], schemas, found)
  }
  return found
}

function parametersOf(place: 'path' | 'query', schema: Json | undefined): Json[] {
  const properties = (schema?.properties ?? {}) as Record<string, Json>
  const required = (schema?.required ?? []) as string[]
  return Object.entries(properties).map(([name, property]) => ({
    name,
    in: place,
    required: place === 'path' || required.includes(name),
    schema: property,
  }))
}

/** Codes that a route can give, its own ones first. */
export function errorsOf(route: RouteContract): ErrorCode[] {
  return [
    ...new Set([
      ...route.errors,
      ...EVERY_ROUTE,
      ...(route.access === 'public' ? [] : WITH_ACCESS),
      ...(route.method === 'get' ? [] : WITH_WRITE),
      ...(route.body ? WITH_BODY : []),
    ]),
  ]
}

function refusalsOf(route: RouteContract): Json {
  const codes = errorsOf(route)
  const statuses = [...new Set(codes.map((code) => STATUS_OF[code]))]
  const refusal = (status: number) => ({
    description: codes
      .filter((code) => STATUS_OF[code] === status)
      .map((code) => `${code}: ${ERRORS[code].title}`)
      .join(' '),
    content: { 'application/problem+json': { schema: { $ref: refTo('Problem', 'output') } } },
  })
  return Object.fromEntries(statuses.map((status) => [String(status), refusal(status)]))
}

/** The HTTP API as OpenAPI 3.1, made from the same contract that parses its requests. */
export function createOpenApi(version: string): Json {
  const registry = namedSchemas()
  const schemas = { ...convert(registry, 'input'), ...convert(registry, 'output') }
  const idOf = (schema: z.ZodType) => registry.get(schema)!.id
  const content = (schema: z.ZodType, direction: Direction) => ({
    'application/json': { schema: { $ref: refTo(idOf(schema), direction) } },
  })
  const inputOf = (schema: z.ZodType | undefined) => schema && schemas[componentName(idOf(schema), 'input')]

  const operation = (key: string, route: RouteContract): Json => ({
    operationId: key,
    summary: route.summary,
    tags: [key.split('.')[0]],
    'x-access': route.access,
    security: route.access === 'public' ? [] : [{ signIn: [] }],
    parameters: [
      ...parametersOf('path', inputOf(route.params)),
      ...parametersOf('query', inputOf(route.query)),
    ],
    ...(route.body ? { requestBody: { required: true, content: content(route.body, 'input') } } : {}),
    responses: {
      [String(route.status)]: { description: 'Done.', content: content(route.answer, 'output') },
      ...refusalsOf(route),
    },
  })

  const paths: Record<string, Json> = {}
  for (const [key, route] of Object.entries(ROUTES) as [RouteKey, RouteContract][]) {
    const path = route.path.replace(/:(\w+)/g, '{$1}')
    paths[path] = { ...paths[path], [route.method]: operation(key, route) }
  }
  const used = [...reachable(paths, schemas)].sort()
  return {
    openapi: '3.1.0',
    info: {
      title: 'Evenstrung',
      version,
      description:
        'Plug-in check of six-element saddle pickups. Errors are application/problem+json (RFC 9457).',
    },
    servers: [{ url: API }],
    paths,
    components: {
      schemas: Object.fromEntries(used.map((name) => [name, schemas[name]!])),
      securitySchemes: { signIn: { type: 'apiKey', in: 'cookie', name: TOKEN_COOKIE } },
    },
  }
}
