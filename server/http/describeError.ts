/**
 * An error for the log. The text of a database error holds the statement with its values (names, addresses,
 * hashes), so only its code and the places in the program are kept.
 */
export function describeError(error: unknown): Record<string, unknown> {
  if (!(error instanceof Error)) return { name: typeof error }
  const { code, errno } = error as { code?: unknown; errno?: unknown }
  const isDatabase = 'sqlMessage' in error || 'sql' in error
  const places = (error.stack ?? '').split('\n').filter((line) => /^\s+at /.test(line))
  return {
    name: error.name,
    ...(code === undefined ? {} : { code }),
    ...(errno === undefined ? {} : { errno }),
    message: isDatabase ? 'database error' : error.message,
    stack: places.map((line) => line.trim()),
  }
}
