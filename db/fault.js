/** A failure whose message is one sentence for the person at the terminal: what is wrong and what to do. */
export class StartFault extends Error {
  /** @param {string} message @param {ErrorOptions} [options] */
  constructor(message, options) {
    super(message, options)
    this.name = 'StartFault'
  }
}

/** @param {unknown} error @returns {string | undefined} the operating system's error code */
export function codeOf(error) {
  if (error instanceof Error && 'code' in error && typeof error.code === 'string') return error.code
  return undefined
}
