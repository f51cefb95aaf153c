import type { Request } from 'express'
import type { z } from 'zod'
import type { RouteContract } from '../../src/shared/contract/routes.ts'
import { AppError } from '../errors.ts'

export interface ParsedInput {
  params: unknown
  query: unknown
  body: unknown
}

/** Parses what the route's contract names; a refusal lists every field that is not right. */
export function parseInput(route: RouteContract, req: Request): ParsedInput {
  const fields: { path: string; message: string }[] = []
  const parse = (schema: z.ZodType | undefined, value: unknown): unknown => {
    if (!schema) return undefined
    const parsed = schema.safeParse(value)
    if (parsed.success) return parsed.data
    fields.push(...parsed.error.issues.map(({ path, message }) => ({ path: path.join('.'), message })))
    return undefined
  }
  if (route.body && !req.is('application/json'))
    throw new AppError('request.malformed', { detail: 'The body has to be application/json.' })
  const input = {
    params: parse(route.params, req.params),
    query: parse(route.query, req.query),
    body: parse(route.body, req.body),
  }
  if (fields.length === 0) return input
  const onlyPassword = fields.every(({ path }) => path === 'password')
  throw new AppError(
    onlyPassword && route.errors.includes('password.weak') ? 'password.weak' : 'request.invalid',
    { fields },
  )
}
