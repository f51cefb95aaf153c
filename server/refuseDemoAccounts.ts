import type { Knex } from 'knex'
import { ConfigError } from './config.ts'
import type { Config } from './config.ts'

/** Production does not start on a database or a data folder in which the whole world knows the passwords. */
export async function refuseDemoAccounts(
  knex: Knex,
  config: Pick<Config, 'mode' | 'dataDir' | 'hasDemoBenchTokens'>,
): Promise<void> {
  if (config.mode !== 'production') return
  const demoUser: unknown = await knex('users')
    .where({ is_demo: true })
    .whereNull('deactivated_at')
    .first('id')
  if (demoUser)
    throw new ConfigError(
      'This database holds demo accounts, whose passwords are public: start production with another DATA_DIR or DATABASE_URL.',
    )
  if (config.hasDemoBenchTokens)
    throw new ConfigError(
      `${config.dataDir}/secrets.json holds the tokens of demo benches: start production with another DATA_DIR.`,
    )
}
