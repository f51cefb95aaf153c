import { createHash, randomBytes, randomUUID } from 'node:crypto'
import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import type { Knex } from 'knex'
import { Serial } from '../../src/shared/contract/runs.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { ConfigError, readConfig } from '../config.ts'
import { connect } from '../connect.ts'

const USAGE = 'npm run bench:enrol -- --name Yard [--code BENCHYARD]'
/** Until its calibration is entered a bench claims no better than this, dB (from memory). */
const U_CAL_OWN_DB = 0.05
const U_CAL_SHARED_DB = 0.1

interface Wanted {
  name: string
  code: string
}

export function readWantedBench(args: string[]): Wanted {
  try {
    const options = { name: { type: 'string' }, code: { type: 'string' } } as const
    const { values } = parseArgs({ args, options })
    const name = values.name?.trim() ?? ''
    const code = values.code ?? `BENCH${name.toUpperCase().replace(/[^A-Z0-9]/g, '')}`
    if (name.length >= 1 && name.length <= 60) return { name, code: Serial.parse(code) }
  } catch (error) {
    throw new ConfigError(`Use: ${USAGE}`, { cause: error })
  }
  throw new ConfigError(`--name is missing or too long. Use: ${USAGE}`)
}

/**
 * Gives a bench its token: a new record, or a new token for the bench of that name. The token is known only to the
 * caller; the database keeps its SHA-256. A bench that is connected with the old token keeps its connection until it
 * ends, so that no run is cut.
 */
export async function enrolBench(
  knex: Knex,
  { name, code }: Wanted,
  at: Date,
): Promise<{ token: string; isNew: boolean }> {
  const token = randomBytes(32).toString('base64url')
  const tokenHash = createHash('sha256').update(token).digest()
  return knex.transaction(async (trx) => {
    const known = await trx('benches')
      .where({ name })
      .forUpdate()
      .first<{ id: string; simulated: number } | undefined>('id', 'simulated')
    if (known?.simulated)
      throw new ConfigError(
        `${name} is a simulated bench: its token is made by the demo. Choose another name.`,
      )
    const id = known?.id ?? randomUUID()
    if (known) await trx('benches').where({ id }).update({ token_hash: tokenHash })
    else
      await trx('benches').insert({
        id,
        name,
        code,
        token_hash: tokenHash,
        simulated: false,
        mains_hz: 50,
        capabilities: JSON.stringify([]),
        calibration_db: JSON.stringify([0, 0, 0, 0, 0, 0]),
        u_cal_own_db: U_CAL_OWN_DB,
        u_cal_shared_db: U_CAL_SHARED_DB,
        created_at: at,
      })
    await insertAudit(
      trx,
      {
        userId: null,
        actor: 'command line',
        action: known ? 'bench.tokenReplaced' : 'bench.enrolled',
        subject: 'bench',
        subjectId: id,
        details: { name },
      },
      at,
    )
    return { token, isNew: !known }
  })
}

async function main(): Promise<void> {
  try {
    const wanted = readWantedBench(process.argv.slice(2))
    const knex = connect(readConfig(process.env).databaseUrl, 1)
    try {
      const { token, isNew } = await enrolBench(knex, wanted, new Date())
      console.log(
        `${isNew ? 'Enrolled' : 'New token for'} bench ${wanted.name}. Its token is shown only now:\n${token}`,
      )
    } finally {
      await knex.destroy()
    }
  } catch (error) {
    if (!(error instanceof ConfigError)) throw error
    console.error(error.message)
    process.exitCode = 1
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await main()
