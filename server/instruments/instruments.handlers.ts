import type { Knex } from 'knex'
import { z } from 'zod'
import { Id } from '../../src/shared/contract/quantities.ts'
import { AppError } from '../errors.ts'
import type { HandlersOf } from '../http/registry.ts'
import { runSummariesOfInstrument } from '../runs/runs.queries.ts'
import { findInstrument, listInstruments } from './instruments.queries.ts'
import type { InstrumentPlace } from './instruments.queries.ts'

const Place = z.object({ createdAt: z.iso.datetime(), id: Id })

const cursorOf = (item: { createdAt: string; id: string }) => `${item.createdAt}_${item.id}`

function placeOf(cursor: string): InstrumentPlace {
  const [createdAt, id] = cursor.split('_')
  const place = Place.safeParse({ createdAt, id })
  if (!place.success)
    throw new AppError('request.invalid', {
      fields: [{ path: 'after', message: 'the next of the page before' }],
    })
  return { createdAt: new Date(place.data.createdAt), id: place.data.id }
}

export function createInstrumentsHandlers(knex: Knex): HandlersOf<'instruments'> {
  return {
    'instruments.list': async ({ query }) => {
      const search = query.search?.trim() ?? ''
      const after = query.after === undefined ? null : placeOf(query.after)
      const rows = await listInstruments(knex, { search, after, limit: query.limit + 1 })
      const items = rows.slice(0, query.limit)
      return { items, next: rows.length > items.length ? cursorOf(items.at(-1)!) : null }
    },
    'instruments.read': async ({ params }) => {
      const found = await findInstrument(knex, params.serial)
      if (!found) throw new AppError('instrument.unknown', { facts: { serial: params.serial } })
      return { ...found, runs: await runSummariesOfInstrument(knex, found.instrument.id) }
    },
  }
}
