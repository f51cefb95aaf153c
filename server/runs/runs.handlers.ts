import type { Knex } from 'knex'
import { AppError } from '../errors.ts'
import { personOf } from '../http/registry.ts'
import type { HandlersOf } from '../http/registry.ts'
import { listRuns } from './runs.queries.ts'
import type { RunsService } from './runs.service.ts'

export function createRunsHandlers(knex: Knex, runs: RunsService): HandlersOf<'runs'> {
  return {
    'runs.list': async ({ query }) => {
      const beforeSeq = query.after === undefined ? undefined : placeOf(query.after)
      const rows = await listRuns(knex, { from: query.from, to: query.to, beforeSeq, limit: query.limit + 1 })
      const items = rows.slice(0, query.limit)
      return {
        items: items.map((row) => row.summary),
        next: rows.length > query.limit ? String(items.at(-1)!.seq) : null,
      }
    },
    'runs.start': ({ body }, context) => runs.start(body, personOf(context)),
    'runs.read': ({ params }) => runs.read(params.id),
    'runs.trace': ({ params, query }) => runs.trace(params.id, query.points),
    'runs.act': ({ params, body }, context) => runs.act(params.id, body, personOf(context)),
    'runs.takeOver': ({ params, body }, context) => runs.takeOver(params.id, body, personOf(context)),
    'runs.recompute': ({ params }) => runs.recompute(params.id),
  }
}

/** Where the page before ended. */
function placeOf(after: string): number {
  const seq = Number(after)
  if (Number.isSafeInteger(seq) && seq > 0) return seq
  throw new AppError('request.invalid', {
    fields: [{ path: 'query.after', message: 'the next of the page before' }],
  })
}
