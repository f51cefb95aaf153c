import { ERRORS } from '../src/shared/contract/errors.ts'
import type { ErrorCode, Problem } from '../src/shared/contract/errors.ts'
import { isStorageAway } from './connect.ts'

export interface ErrorDetails {
  detail?: string
  fields?: { path: string; message: string }[]
  facts?: Record<string, string | number | boolean | null>
}

/** A refusal that the person or the bench is told of; everything else that is thrown becomes 'server.error'. */
export class AppError extends Error {
  override name = 'AppError'
  readonly code: ErrorCode
  readonly details: ErrorDetails

  constructor(code: ErrorCode, details: ErrorDetails = {}) {
    super(`${code}: ${ERRORS[code].title}`)
    this.code = code
    this.details = details
  }
}

/** HTTP status of each code; sockets carry the same number. */
export const STATUS_OF: Record<ErrorCode, number> = {
  'request.invalid': 400,
  'request.malformed': 400,
  'request.too-large': 413,
  'request.origin': 403,
  'route.unknown': 404,
  'sign-in.wrong': 401,
  'sign-in.wait': 429,
  'sign-in.required': 401,
  'sign-in.reused': 401,
  'invite.invalid': 410,
  'password.weak': 400,
  'permission.denied': 403,
  'instrument.unknown': 404,
  'instrument.model-differs': 409,
  'serial.invalid': 400,
  'model.unknown': 404,
  'sheet.none-in-force': 409,
  'bench.unknown': 404,
  'bench.offline': 409,
  'bench.busy': 409,
  'bench.differs': 409,
  'bench.not-simulated': 409,
  'bench.token': 401,
  'bench.replaced': 409,
  'protocol.version': 400,
  'protocol.hello-first': 409,
  'protocol.message': 400,
  'protocol.unknown-event': 404,
  'frames.in-flight': 409,
  'frames.gap': 409,
  'frames.window': 413,
  'frames.foreign': 409,
  'frames.channels': 400,
  'frames.event-place': 400,
  'measure.high-voltage': 400,
  'run.unknown': 404,
  'run.serial-busy': 409,
  'run.not-open': 409,
  'run.action-not-now': 409,
  'run.not-yours': 403,
  'cautions.needed': 409,
  'record.changed': 409,
  'record.exists': 409,
  'storage.away': 503,
  'server.error': 500,
}

/** What a thrown thing means to the outside: its own code, 'storage.away', or plainly 'server.error'. */
export function appErrorOf(error: unknown): AppError {
  if (error instanceof AppError) return error
  return new AppError(isStorageAway(error) ? 'storage.away' : 'server.error')
}

/** RFC 9457 body of a thrown thing; of an unknown one it tells nothing but the request's id. */
export function problemOf(error: unknown, requestId?: string): Problem {
  const { code, details } = appErrorOf(error)
  return {
    type: `urn:problem-type:evenstrung:${code}`,
    code,
    title: ERRORS[code].title,
    remedy: ERRORS[code].remedy,
    status: STATUS_OF[code],
    ...details,
    ...(requestId === undefined ? {} : { requestId }),
  }
}
