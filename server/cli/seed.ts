import { createHash, randomBytes } from 'node:crypto'
import { existsSync, readFileSync, renameSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { fileURLToPath } from 'node:url'
import bcrypt from 'bcryptjs'
import type { Knex } from 'knex'
import { DEMO_BENCHES, DEMO_MODELS, DEMO_PEOPLE, WORKSHOP, demoId, demoSheets } from '../../db/seeds/demo.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { connect } from '../connect.ts'

export interface SeedResult {
  /** token of each enrolled bench, by its key */
  benchTokens: Record<string, string>
  accounts: { email: string; password: string; roles: string[] }[]
}

/** Fills an empty database with the demo workshop; null when it is not empty. */
export async function seedDemo(
  knex: Knex,
  options: { password: string; bcryptCost: number; at: Date },
): Promise<SeedResult | null> {
  if ((await knex('users').first('id')) as unknown) return null
  const { password, at } = options
  const hash = await bcrypt.hash(password, options.bcryptCost)
  const benchTokens: Record<string, string> = {}
  await knex.transaction(async (trx) => {
    await trx('workshop_settings').insert({
      id: 1,
      name: WORKSHOP.name,
      time_zone: WORKSHOP.timeZone,
      shifts: JSON.stringify(WORKSHOP.shifts),
      serial_pattern: WORKSHOP.serialPattern,
    })
    for (const person of DEMO_PEOPLE) {
      const id = demoId(person.email)
      await trx('users').insert({
        id,
        name: person.name,
        email: person.email,
        password_hash: hash,
        is_demo: true,
        created_at: at,
      })
      for (const role of person.roles) await trx('user_roles').insert({ user_id: id, role })
    }
    for (const bench of DEMO_BENCHES) {
      const token = randomBytes(32).toString('base64url')
      if (bench.enrolled) benchTokens[bench.key] = token
      await trx('benches').insert({
        id: demoId(`bench ${bench.key}`),
        name: bench.name,
        code: bench.code,
        token_hash: bench.enrolled ? createHash('sha256').update(token).digest() : null,
        simulated: bench.simulated,
        mains_hz: 50,
        capabilities: JSON.stringify([]),
        calibration_db: JSON.stringify([0, 0, 0, 0, 0, 0]),
        u_cal_own_db: 0.05,
        u_cal_shared_db: 0.1,
        created_at: at,
      })
    }
    for (const model of DEMO_MODELS)
      await trx('models').insert({
        id: model.id,
        key: model.key,
        name: model.name,
        strings: model.strings,
        handedness: model.handedness,
        circuit: model.circuit,
        jack_kind: model.jackKind,
        tuning: JSON.stringify(model.tuning),
        is_recording: model.isRecording,
      })
    for (const { sheet, modelId } of demoSheets())
      await trx('threshold_revisions').insert({
        id: sheet.id,
        model_id: modelId,
        revision: sheet.revision,
        label: sheet.label,
        status: 'inForce',
        in_force_from: at,
        sheet: JSON.stringify(sheet),
        proposed_by: demoId('engineer@harrowlane.test'),
        put_in_force_by: demoId('qc@harrowlane.test'),
        created_at: at,
      })
    await insertAudit(
      trx,
      {
        userId: null,
        actor: 'seed',
        action: 'demo.seeded',
        subject: 'workshop',
        subjectId: '1',
        details: { people: DEMO_PEOPLE.length, models: DEMO_MODELS.length, benches: DEMO_BENCHES.length },
      },
      at,
    )
  })
  const accounts = DEMO_PEOPLE.map((person) => ({
    email: person.email,
    password,
    roles: person.roles,
  }))
  return { benchTokens, accounts }
}

/** The demo's password is no secret: the accounts exist only in the invented workshop, production refuses them. */
export const DEMO_PASSWORD = 'harrow-lane-demo'

/** The simulated benches read their tokens from the secrets file, which nobody else may read. */
function addBenchTokens(file: string, benchTokens: Record<string, string>): void {
  const secrets = existsSync(file) ? (JSON.parse(readFileSync(file, 'utf8')) as Record<string, unknown>) : {}
  writeFileSync(`${file}.new`, `${JSON.stringify({ ...secrets, benchTokens }, null, 2)}\n`, { mode: 0o600 })
  renameSync(`${file}.new`, file)
}

async function main(): Promise<void> {
  const url = process.env.DATABASE_URL
  if (!url) throw new Error('Set DATABASE_URL first.')
  const dataDir = path.resolve(process.env.DATA_DIR || '.data')
  const knex = connect(url, 2)
  try {
    const seeded = await seedDemo(knex, {
      password: DEMO_PASSWORD,
      bcryptCost: Number(process.env.BCRYPT_COST || 12),
      at: new Date(),
    })
    if (!seeded) {
      console.log('the database is not empty, so nothing was seeded')
      return
    }
    addBenchTokens(path.join(dataDir, 'secrets.json'), seeded.benchTokens)
    writeFileSync(path.join(dataDir, 'demo-accounts.json'), `${JSON.stringify(seeded.accounts, null, 2)}\n`, {
      mode: 0o600,
    })
    console.log(`seeded the demo workshop ${WORKSHOP.name}`)
  } finally {
    await knex.destroy()
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await main()
