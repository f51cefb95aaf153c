import type { ErrorCode } from '../contract/errors.ts'

/** An action that does not fit the present step. `detail` says why, for the person. */
export class MeasureRefusal extends Error {
  readonly code: ErrorCode
  readonly detail: string

  constructor(code: ErrorCode, detail: string) {
    super(`${code}: ${detail}`)
    this.name = 'MeasureRefusal'
    this.code = code
    this.detail = detail
  }
}
