import pino from 'pino'
import type { Logger } from 'pino'
import type { Config } from './config.ts'

/** Keys whose values must never reach a log, wherever in an entry they stand. */
const NEVER = ['password', 'token', 'cookie', 'authorization', 'email', 'phone', 'address', 'secret']

export function createLog(config: Pick<Config, 'logLevel'>, destination?: pino.DestinationStream): Logger {
  const paths = NEVER.flatMap((key) => [key, `*.${key}`, `*.*.${key}`])
  const options = { level: config.logLevel, base: null, redact: { paths, censor: '(not logged)' } }
  return destination ? pino(options, destination) : pino(options)
}
