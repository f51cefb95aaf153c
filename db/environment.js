import path from 'node:path'
import { projectDir } from './settings.js'

/** @typedef {import('./settings.js').Settings} Settings */
/** @typedef {{ appUrl: string, ownerUrl: string }} Addresses */

/**
 * Environment of the server and of tools that do the application's work: never the owner of the tables.
 * @param {Settings} settings
 * @param {Addresses} addresses
 * @returns {NodeJS.ProcessEnv}
 */
export function appEnvironment(settings, { appUrl }) {
  const { DATABASE_OWNER_URL: _owner, ...inherited } = process.env
  return {
    ...inherited,
    NODE_ENV: 'production',
    PORT: String(settings.port),
    HOST: settings.host,
    DATA_DIR: settings.dataDir,
    DATABASE_URL: appUrl,
    EVENSTRUNG_MODE: settings.mode,
  }
}

/**
 * Environment of the tools that change tables.
 * @param {Settings} settings
 * @param {Addresses} addresses
 * @returns {NodeJS.ProcessEnv}
 */
export const ownerEnvironment = (settings, addresses) => ({
  ...appEnvironment(settings, addresses),
  DATABASE_OWNER_URL: addresses.ownerUrl,
})

/** @param {string} inside path below dist */
export const built = (inside) => path.join(projectDir, 'dist', inside)

/** Tools of server/cli that change tables or rights. */
export const ownerTools = ['migrate']
