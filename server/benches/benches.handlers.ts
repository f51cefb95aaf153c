import type { Knex } from 'knex'
import { AppError } from '../errors.ts'
import type { HandlersOf } from '../http/registry.ts'
import type { BenchConnections } from './benchConnections.ts'
import { findBench, listBenches } from './benches.queries.ts'

export function createBenchesHandlers(
  knex: Knex,
  hub: BenchConnections,
  now: () => Date,
): HandlersOf<'benches'> {
  return {
    'benches.list': async () => ({ items: await listBenches(knex, hub, now()) }),
    'benches.simulate': async ({ params, body }) => {
      const bench = await findBench(knex, hub, params.id, now())
      if (!bench) throw new AppError('bench.unknown')
      if (!bench.simulated) throw new AppError('bench.not-simulated', { facts: { bench: bench.name } })
      if (!bench.connected) throw new AppError('bench.offline', { facts: { bench: bench.name } })
      await hub.simulate(bench.id, body)
      return {}
    },
  }
}
