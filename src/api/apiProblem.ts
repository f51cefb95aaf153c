import type { ErrorCode, Problem } from '../shared/contract/errors.ts'
import { CLIENT_PROBLEMS } from '../texts.ts'
import type { ClientCode } from '../texts.ts'

/** A refusal as the server gave it, or one that no server could give (not reached, not understood). */
export class ApiProblem extends Error {
  readonly code: ErrorCode | ClientCode
  readonly title: string
  readonly remedy: string
  /** The server's own words for this one case, when it has any. */
  readonly detail: string | undefined
  readonly status: number
  readonly requestId: string | undefined
  readonly fields: NonNullable<Problem['fields']>
  readonly facts: NonNullable<Problem['facts']>

  constructor(problem: Problem | ClientCode, options?: ErrorOptions) {
    const given =
      typeof problem === 'string' ? { ...CLIENT_PROBLEMS[problem], code: problem, status: 0 } : problem
    super(given.title, options)
    this.name = 'ApiProblem'
    this.code = given.code
    this.title = given.title
    this.remedy = given.remedy
    this.status = given.status
    const rest: Partial<Problem> = typeof problem === 'string' ? {} : problem
    this.detail = rest.detail
    this.requestId = rest.requestId
    this.fields = rest.fields ?? []
    this.facts = rest.facts ?? {}
  }

  /** What the server said about one field of the form. */
  fieldMessage(path: string): string | undefined {
    return this.fields.find((field) => field.path === path)?.message
  }
}

/** Whatever was thrown, as a problem that a screen can show. */
export function toApiProblem(cause: unknown): ApiProblem {
  return cause instanceof ApiProblem ? cause : new ApiProblem('client.answer', { cause })
}

/** True for the error that a cancelled request throws. */
export function isAbort(cause: unknown): boolean {
  return cause instanceof Error && cause.name === 'AbortError'
}
