import { expect, test } from 'vitest'
import { ensurePackages, missingPackages } from '../../db/packages.js'

/** A system that has some programs, and gets those of an installed package. */
function systemWith({ programs, root, sudo = false }: { programs: string[]; root: boolean; sudo?: boolean }) {
  const there = new Set(programs)
  const commands: string[] = []
  return {
    commands,
    find: (name: string) => (there.has(name) ? `/usr/bin/${name}` : undefined),
    isRoot: () => root,
    run: (words: string[]) => {
      commands.push(words.join(' '))
      if (words[0] === 'sudo' && !sudo)
        return Promise.resolve({ exitCode: 1, output: 'a password is required' })
      if (words.includes('mariadb-server-core'))
        for (const name of ['mariadbd', 'mariadb-install-db', 'mariadb', 'mariadb-dump']) there.add(name)
      return Promise.resolve({ exitCode: 0, output: '' })
    },
  }
}

test('missingPackages() names the package of each program that is not there', () => {
  const has =
    (...names: string[]) =>
    (name: string) =>
      names.includes(name) ? `/bin/${name}` : undefined
  expect(missingPackages(['start'], has('mariadbd', 'mariadb', 'mariadb-dump'))).toEqual([
    'mariadb-server-core',
  ])
  expect(missingPackages(['test'], has())).toEqual(['chromium', 'sox'])
})

test('ensurePackages() installs as root, lists first, without a question and without recommended packages', async () => {
  const system = systemWith({ programs: ['apt-get'], root: true })
  await ensurePackages(['start'], system)
  expect(system.commands).toEqual([
    'env DEBIAN_FRONTEND=noninteractive apt-get update -o DPkg::Lock::Timeout=120',
    'env DEBIAN_FRONTEND=noninteractive apt-get install -y --no-install-recommends mariadb-server-core mariadb-client -o DPkg::Lock::Timeout=120',
  ])
})

test('ensurePackages() uses a sudo that asks for no password', async () => {
  const system = systemWith({ programs: ['apt-get', 'sudo'], root: false, sudo: true })
  await ensurePackages(['start'], system)
  expect(system.commands.slice(1).every((command) => command.startsWith('sudo -n env '))).toBe(true)
  expect(system.commands).toHaveLength(3)
})

test.each([
  ['without sudo', ['apt-get']],
  ['with a sudo that asks for a password', ['apt-get', 'sudo']],
])('ensurePackages() %s installs nothing and says the one command', async (_, programs) => {
  const system = systemWith({ programs, root: false })
  await expect(ensurePackages(['start'], system)).rejects.toThrow(
    "Run this once, then the same command again: sudo sh -c 'apt-get update && apt-get install -y --no-install-recommends mariadb-server-core mariadb-client'",
  )
  expect(system.commands.filter((command) => command.includes('apt-get'))).toEqual([])
})

test('ensurePackages() touches nothing when all is there', async () => {
  const system = systemWith({
    programs: ['mariadbd', 'mariadb-install-db', 'mariadb', 'mariadb-dump'],
    root: true,
  })
  await ensurePackages(['start'], system)
  expect(system.commands).toEqual([])
})
