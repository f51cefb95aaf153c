import type { Knex } from 'knex'
import type { Person } from '../../src/shared/contract/auth.ts'
import { isAllowed } from '../../src/shared/contract/permissions.ts'
import type { SimulationCommand } from '../../src/shared/contract/simulation.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import type { AuditEntry } from '../audit/audit.queries.ts'
import { AppError } from '../errors.ts'
import { personOf } from '../http/registry.ts'
import type { HandlersOf } from '../http/registry.ts'
import type { BenchConnections } from './benchConnections.ts'
import { findBench, findOpener, listBenches } from './benches.queries.ts'

/** Another modelled instrument decides what the next run measures. */
function placedBy(person: Person, benchId: string, command: SimulationCommand): AuditEntry {
  return {
    userId: person.id,
    actor: person.name,
    action: 'bench.placed',
    subject: 'bench',
    subjectId: benchId,
    details: { ...command },
  }
}

export function createBenchesHandlers(
  knex: Knex,
  hub: BenchConnections,
  now: () => Date,
): HandlersOf<'benches'> {
  return {
    'benches.list': async () => ({ items: await listBenches(knex, hub, now()) }),
    'benches.simulate': async ({ params, body }, context) => {
      const bench = await findBench(knex, hub, params.id, now())
      if (!bench) throw new AppError('bench.unknown')
      if (!bench.simulated) throw new AppError('bench.not-simulated', { facts: { bench: bench.name } })
      if (!bench.connected) throw new AppError('bench.offline', { facts: { bench: bench.name } })
      const person = personOf(context)
      const opener = await findOpener(knex, bench.id)
      if (opener && opener.id !== person.id && !isAllowed(person.roles, 'stopAnyRun'))
        throw new AppError('run.not-yours', { facts: { person: opener.name } })
      if (body.kind !== 'place') {
        await hub.simulate(bench.id, body)
        return {}
      }
      await knex.transaction(async (trx) => {
        await insertAudit(trx, placedBy(person, bench.id, body), now())
        await hub.simulate(bench.id, body)
      })
      return {}
    },
  }
}
