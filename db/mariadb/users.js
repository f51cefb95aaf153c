import { existsSync, mkdirSync, readdirSync, rmSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { startTimeOf } from '../processes.js'

/** @typedef {import('./instance.js').Instance} Instance */

/** @param {Instance} instance */
const ownFile = (instance) => path.join(instance.usersDir, `${process.pid}-${startTimeOf(process.pid)}`)

/** @param {Instance} instance */
export function signOn(instance) {
  mkdirSync(instance.usersDir, { recursive: true, mode: 0o700 })
  writeFileSync(ownFile(instance), '')
}

/** @param {Instance} instance @returns {boolean} whether nobody else uses the server */
export function signOff(instance) {
  rmSync(ownFile(instance), { force: true })
  return livingUsers(instance).length === 0
}

/** Processes that use the server; the files of dead ones are removed. @param {Instance} instance */
export function livingUsers(instance) {
  if (!existsSync(instance.usersDir)) return []
  return readdirSync(instance.usersDir).filter((name) => {
    const [pid, startTime] = name.split('-')
    if (startTimeOf(Number(pid)) === startTime) return true
    rmSync(path.join(instance.usersDir, name), { force: true })
    return false
  })
}
