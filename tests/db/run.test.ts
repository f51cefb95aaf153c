import { spawnSync } from 'node:child_process'
import { readFileSync } from 'node:fs'
import path from 'node:path'
import { transform } from 'esbuild'
import { expect, test } from 'vitest'
import { projectDir } from '../helpers/sources.ts'

const guard = path.join(projectDir, 'db', 'run.cjs')

/** Runs the entry as if Node.js had that version. */
function runAs(version: string) {
  const pretend = `Object.defineProperty(process, 'versions', { value: { ...process.versions, node: '${version}' } })`
  return spawnSync(process.execPath, ['-e', `${pretend}; require(${JSON.stringify(guard)})`], {
    encoding: 'utf8',
  })
}

test.each(['0.10.48', '12.22.12', '18.20.4', '20.18.3'])(
  'an old Node.js %s is refused in one sentence',
  (version) => {
    const { status, stdout, stderr } = runAs(version)
    expect(status).toBe(1)
    expect(stdout).toBe('')
    expect(stderr).toBe(
      `Evenstrung needs Node.js 20.19 or newer, this is ${version}: install Node.js 20 and run the same command again.\n`,
    )
  },
)

test.each(['20.19.0', '22.1.0', '24.0.0'])('Node.js %s goes on to the command', (version) => {
  const { status, stderr } = runAs(version)
  expect(status).toBe(1)
  expect(stderr).toMatch(/^There is no command '': use one of start, dev, /)
})

test('the guard holds only syntax that the oldest Node.js reads', async () => {
  await expect(transform('const x = 1', { target: 'es5' })).rejects.toThrow()
  const { warnings } = await transform(readFileSync(guard, 'utf8'), { target: 'es5' })
  expect(warnings).toEqual([])
})

test('an unknown command is answered with the known ones', () => {
  const { status, stderr } = spawnSync(process.execPath, [guard, 'fly'], { encoding: 'utf8' })
  expect(status).toBe(1)
  expect(stderr).toMatch(/^There is no command 'fly': use one of start, .*restore\.\n$/)
})
