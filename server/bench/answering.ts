import type { Socket } from 'socket.io'
import type { Logger } from 'pino'
import type { z } from 'zod'
import type { ErrorCode, Problem } from '../../src/shared/contract/errors.ts'
import { AppError, problemOf } from '../errors.ts'

export type Answer<T extends object> = ({ ok: true } & T) | { ok: false; problem: Problem }

export interface AnswerDeps {
  log: Logger
  /** every refusal is counted by its code */
  refused: (code: string) => void
}

/**
 * The one way in which sockets are listened to: parses, catches and answers, also when no answer function came, so
 * that no message can throw. A message of unknown name is refused as well.
 */
export function answering(
  socket: Pick<Socket, 'on' | 'onAny' | 'emit'>,
  deps: AnswerDeps,
  refusedEvent: string,
): <S extends z.ZodType, T extends object>(
  event: string,
  schema: S,
  handle: (message: z.output<S>) => Promise<T>,
) => void {
  const known = new Set<string>()
  const refuse = (error: unknown, event: string, answer: unknown): void => {
    const problem = problemOf(error)
    deps.refused(problem.code)
    if (problem.code === 'server.error')
      deps.log.error({ err: error, event }, 'a message could not be handled')
    else deps.log.debug({ code: problem.code, event }, 'message refused')
    if (typeof answer === 'function') (answer as (a: Answer<object>) => void)({ ok: false, problem })
    else socket.emit(refusedEvent, problem)
  }

  socket.onAny((event: string, ...args: unknown[]) => {
    if (!known.has(event)) refuse(new AppError('protocol.unknown-event'), 'unknown', args.at(-1))
  })

  return (event, schema, handle) => {
    known.add(event)
    socket.on(event, (...args: unknown[]) => {
      const answer = args.at(-1)
      const message = typeof args[0] === 'function' ? undefined : args[0]
      const work = async (): Promise<void> => {
        try {
          const parsed = schema.safeParse(message)
          if (!parsed.success) throw shapeProblem(message, parsed.error)
          const values = await handle(parsed.data)
          if (typeof answer === 'function') (answer as (a: Answer<object>) => void)({ ok: true, ...values })
        } catch (error) {
          refuse(error, event, answer)
        }
      }
      work().catch((error: unknown) =>
        deps.log.error({ err: error, event }, 'a message could not be answered'),
      )
    })
  }
}

const MOST_FIELDS = 5
const MOST_TEST_MILLIVOLT = 5000

function shapeProblem(message: unknown, error: z.ZodError): AppError {
  const fields = error.issues
    .slice(0, MOST_FIELDS)
    .map((issue) => ({ path: issue.path.map(String).join('.'), message: issue.message }))
  return new AppError(codeOfShape(error, message), { fields })
}

function codeOfShape(error: z.ZodError, message: unknown): ErrorCode {
  const isTooLong = error.issues.some((issue) => issue.code === 'too_big' && issue.path.join() === 'frames')
  if (isTooLong) return 'frames.window'
  const isVoltage = error.issues.some((issue) => issue.path.at(-1) === 'testMillivolt')
  return isVoltage && hasHighVoltage(message) ? 'measure.high-voltage' : 'protocol.message'
}

function hasHighVoltage(message: unknown): boolean {
  const { events } = message as { events?: unknown }
  return (
    Array.isArray(events) &&
    events.some(
      (event: { testMillivolt?: unknown } | null) => Number(event?.testMillivolt) > MOST_TEST_MILLIVOLT,
    )
  )
}
