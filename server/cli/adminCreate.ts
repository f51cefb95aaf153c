import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import { z } from 'zod'
import { Email } from '../../src/shared/contract/auth.ts'
import { Role } from '../../src/shared/contract/permissions.ts'
import { invitePerson } from '../auth/people.service.ts'
import { ConfigError, readConfig } from '../config.ts'
import { connect } from '../connect.ts'

const USAGE = 'npm run admin:create -- --email a@example.org --name "A Person" [--role lead --role qc]'

const Wanted = z.object({
  email: Email,
  name: z.string().trim().min(1).max(120),
  roles: z.array(Role).min(1),
})

/** What the person at the command line asked for; throws ConfigError with the usage when it is not right. */
export function readWanted(args: string[]): z.infer<typeof Wanted> {
  let values: { email?: string | undefined; name?: string | undefined; role?: string[] | undefined }
  try {
    const options = {
      email: { type: 'string' },
      name: { type: 'string' },
      role: { type: 'string', multiple: true },
    } as const
    values = parseArgs({ args, options }).values
  } catch (error) {
    throw new ConfigError(`Use: ${USAGE}`, { cause: error })
  }
  const wanted = Wanted.safeParse({ email: values.email, name: values.name, roles: values.role ?? ['admin'] })
  if (wanted.success) return wanted.data
  const field = String(wanted.error.issues[0]!.path[0]).replace('roles', 'role')
  throw new ConfigError(`--${field} is missing or not right. Use: ${USAGE}`)
}

/** Makes the person and gives the one-time link. */
export async function createByLink(args: string[], env: Record<string, string | undefined>, now: Date) {
  const wanted = readWanted(args)
  const config = readConfig(env)
  const knex = connect(config.databaseUrl, 1)
  try {
    const invited = await invitePerson(knex, wanted, { userId: null, name: 'command line' }, now)
    if (!invited)
      throw new ConfigError(
        `${wanted.email} has an account already: sign in with it, or choose another address.`,
      )
    const origin = config.publicUrl ?? `http://${config.host}:${config.port}`
    return { link: `${origin}/invite/${invited.token}`, expiresAt: invited.expiresAt }
  } finally {
    await knex.destroy()
  }
}

async function main(): Promise<void> {
  try {
    const { link, expiresAt } = await createByLink(process.argv.slice(2), process.env, new Date())
    console.log(
      `Open this link once, until ${expiresAt.toISOString().slice(0, 16).replace('T', ' ')} UTC, and set a password:\n${link}`,
    )
  } catch (error) {
    if (!(error instanceof ConfigError)) throw error
    console.error(error.message)
    process.exitCode = 1
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await main()
