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

/** What the person at the terminal reads of a failure. @param {unknown} error @returns {string} */
export function messageOf(error) {
  if (error instanceof StartFault) return error.message
  if (codeOf(error) === 'ENOSPC')
    return 'The disk is full: free some space and run the same command again, nothing was lost.'
  return error instanceof Error ? (error.stack ?? error.message) : String(error)
}
