import { existsSync, readFileSync } from 'node:fs'
import path from 'node:path'
import { describe, expect, test } from 'vitest'
import type { z } from 'zod'
import { readSettings } from '../../db/settings.js'
import { DEMO_PEOPLE } from '../../db/seeds/demo.ts'
import { MIGRATIONS } from '../../db/migrations/index.ts'
import { DEMO_PASSWORD } from '../../server/cli/seed.ts'
import { SETTINGS } from '../../server/config.ts'
import { STATUS_OF } from '../../server/errors.ts'
import { ERROR_CODES, ERRORS } from '../../src/shared/contract/errors.ts'
import * as frames from '../../src/shared/contract/frames.ts'
import { Permission, PERMISSIONS, Role, ROLE_NAMES } from '../../src/shared/contract/permissions.ts'
import { Capability } from '../../src/shared/contract/rules.ts'
import * as constants from '../../src/shared/measure/constants.ts'
import { METHOD } from '../../src/shared/measure/method.ts'
import { projectDir, projectFiles } from '../helpers/sources.ts'

const read = (file: string) => readFileSync(path.join(projectDir, file), 'utf8')
const docs = { 'README.md': read('README.md'), 'DEVELOPERS.md': read('DEVELOPERS.md') }
const everyDoc = Object.entries(docs)
const readme = docs['README.md']
const developers = docs['DEVELOPERS.md']

/** What stands under a heading, up to the next one of its rank or above. */
function section(text: string, title: string): string {
  const [, marks, rest] = new RegExp(`^(#+) ${title}$([\\s\\S]*)`, 'm').exec(text) ?? []
  if (marks === undefined || rest === undefined) throw new Error(`there is no heading '${title}'`)
  const end = new RegExp(`^#{1,${marks.length}} `, 'm').exec(rest)
  return end ? rest.slice(0, end.index) : rest
}

/** The rows of every table in a text, head and rule line left out; a cell without its code marks. */
function rowsOf(text: string): string[][] {
  const lines = text.split('\n')
  const isRow = (line: string | undefined) => line?.startsWith('|') ?? false
  const isRule = (line: string | undefined) => /^\|[\s:|-]+\|$/.test(line ?? '')
  return lines
    .filter((line, i) => isRow(line) && !isRule(line) && !isRule(lines[i + 1]))
    .map((line) =>
      line
        .slice(1, line.lastIndexOf('|'))
        .split('|')
        .map((cell) => cell.trim().replace(/^`([^`]*)`$/, '$1')),
    )
}

const firstCells = (text: string) => rowsOf(text).map(([first]) => first)
const fenced = (text: string) => [...text.matchAll(/^```\w*\n([\s\S]*?)^```/gm)].map(([, code]) => code ?? '')
const inline = (text: string) =>
  [...text.replace(/^```[\s\S]*?^```/gm, '').matchAll(/`([^`\n]+)`/g)].map(([, code]) => code ?? '')

test('the readers of tables and sections find what is there and nothing else', () => {
  const text =
    '# A\n\n## B\n\n| X | Y |\n| --- | --- |\n| `a` | 1 |\n| b `c` |  |\n\n### C\n\n## D\n\n| E |\n| - |\n| f |\n'
  expect(rowsOf(section(text, 'B'))).toEqual([
    ['a', '1'],
    ['b `c`', ''],
  ])
  expect(section(text, 'B')).toContain('### C')
  expect(rowsOf(section(text, 'C'))).toEqual([])
  expect(() => section(text, 'Z')).toThrow("no heading 'Z'")
})

describe('README.md', () => {
  test('lists every setting of the server and of the launcher with its default, and no other', () => {
    const { databasePort, databaseName, externalDatabase } = readSettings({})
    expect(externalDatabase).toBeUndefined()
    const wanted = new Map<string, string>([
      ...SETTINGS.map(({ name, fallback }): [string, string] => [
        name,
        fallback === null ? 'none' : fallback === '' ? 'empty' : fallback,
      ]),
      ['DB_PORT', String(databasePort)],
      ['DB_NAME', databaseName],
      ['DATABASE_OWNER_URL', 'none'],
    ])
    const listed = new Map(
      rowsOf(section(readme, 'Settings')).map(([name, value]): [string, string] => [name!, value!]),
    )
    expect(Object.fromEntries(listed)).toEqual(Object.fromEntries(wanted))
  })

  test('lists every demo account with its role, and the password', () => {
    const accounts = section(readme, 'Demo accounts')
    expect(rowsOf(accounts)).toEqual(
      DEMO_PEOPLE.map(({ email, roles }) => [email, roles.map((role) => ROLE_NAMES[role]).join(', ')]),
    )
    expect(inline(accounts)).toContain(DEMO_PASSWORD)
  })

  test('opens with the job, then the picture, then the two commands', () => {
    const places = [
      /^Evenstrung runs the plug-in check/m,
      /^!\[.+\]\(docs\/check-screen\.png\)$/m,
      /^npm start /m,
    ]
    const found = places.map((place) => readme.search(place))
    expect(found.every((place) => place >= 0)).toBe(true)
    expect(found).toEqual(found.toSorted((a, b) => a - b))
  })

  test('defers to the workshop and to local codes where it cautions', () => {
    expect(section(readme, 'Cautions')).toMatch(/own rules[\s\S]*local codes[\s\S]*licence/)
  })
})

describe('DEVELOPERS.md', () => {
  test('lists every error code once with status, title, remedy and a file that names it', () => {
    const rows = rowsOf(section(developers, 'Error codes'))
    expect(rows.map((row) => row.slice(0, 4))).toEqual(
      ERROR_CODES.map((code) => [code, String(STATUS_OF[code]), ERRORS[code].title, ERRORS[code].remedy]),
    )
    const program = projectFiles()
      .filter(
        (file) =>
          /^server\/.*\.ts$/.test(file) && file !== 'server/errors.ts' && file !== 'server/openapi.ts',
      )
      .map((file) => read(file))
    for (const [code, , , , by] of rows) {
      const named = `'${code}'`
      if (by === 'nothing yet')
        expect(
          program.filter((text) => text.includes(named)),
          code,
        ).toEqual([])
      else expect(read(by!), `${by} names ${code}`).toContain(named)
    }
  })

  test('lists every permission with the roles that hold it', () => {
    const rows = rowsOf(section(developers, 'Security notes'))
    expect(rows).toEqual(
      Permission.options.map((permission) => [
        permission,
        ...Role.options.map((role) => (PERMISSIONS[permission].includes(role) ? 'x' : '')),
      ]),
    )
  })

  test('maps every folder of src, server, simulator, db and tests, and none that is gone', () => {
    const tops = ['src', 'server', 'simulator', 'db', 'tests']
    const folders = projectFiles()
      .map((file) => file.split('/'))
      .filter(([top, , deeper]) => tops.includes(top!) && deeper !== undefined)
      .map(([top, inner]) => `${top}/${inner}/`)
    const listed = firstCells(section(developers, 'Folder map')).map((cell) => cell!)
    expect(
      [...new Set([...tops.map((top) => `${top}/`), ...folders])].filter((one) => !listed.includes(one)),
    ).toEqual([])
    expect(listed.filter((one) => !existsSync(path.join(projectDir, one)))).toEqual([])
  })

  test('names every table that the migrations make, and no other', () => {
    const made = MIGRATIONS.flatMap(([name]) =>
      [...read(`db/migrations/${name}.ts`).matchAll(/createTable\('(\w+)'/g)].map(([, table]) => table),
    )
    expect(firstCells(section(developers, 'What is stored where')).toSorted()).toEqual(made.toSorted())
  })

  test('names every message of the bench protocol', () => {
    const contract = read('src/shared/contract/frames.ts')
    const messages = [...contract.matchAll(/^ {2}'((?:bench|run):\w+)':/gm)].map(([, name]) => name)
    expect(messages.length).toBeGreaterThan(8)
    const listed = firstCells(section(developers, 'Connection'))
    expect(listed.toSorted()).toEqual(messages.toSorted())
  })

  test("names every message of the screens' socket", () => {
    const contract = read('src/shared/contract/live.ts')
    const messages = [...contract.matchAll(/^ {2}'(\w+:\w+)':/gm)].map(([, name]) => name)
    expect(firstCells(section(developers, "The screens' socket")).toSorted()).toEqual(messages.toSorted())
  })

  test('describes every field of hello, verification and frame, every event kind and capability', () => {
    const fields = (schema: z.ZodObject) => Object.keys(schema.shape)
    const hello = firstCells(section(developers, 'Hello'))
    expect(hello).toEqual([...fields(frames.BenchHello), ...Capability.options])
    expect(firstCells(section(developers, 'Verification'))).toEqual(fields(frames.BenchVerify))
    const kinds = frames.BenchEvent.options.map(({ shape }) => shape.kind.value)
    expect(firstCells(section(developers, 'Frames'))).toEqual([...fields(frames.Frame), ...kinds])
    for (const event of frames.BenchEvent.options) {
      const row = rowsOf(section(developers, 'Frames')).find(([kind]) => kind === event.shape.kind.value)
      const own = fields(event).filter(
        (name) => !['kind', 'frame', 'startTenthMs', 'durationTenthMs'].includes(name),
      )
      for (const name of own) expect(row?.[1]).toContain(`\`${name}\``)
    }
  })

  test('gives examples of messages that the server accepts', () => {
    const schemas: Record<string, z.ZodType | undefined> = frames as never
    const examples = [...developers.matchAll(/<!-- schema: (\w+) -->\s+```json\n([\s\S]*?)^```/gm)]
    expect(examples.length).toBeGreaterThanOrEqual(4)
    for (const [, name, json] of examples)
      expect(() => schemas[name!]!.parse(JSON.parse(json!)), name).not.toThrow()
  })

  test('gives every constant of the method with its value', () => {
    const method = section(developers, 'The method').replace(/\s+/g, ' ')
    for (const [name, value] of Object.entries(constants))
      expect(method, name).toMatch(
        new RegExp(`\`${name}\` = ${String(value).replace('.', '\\.')}(?![\\d.]*\\d)`),
      )
  })

  test('has a line for every method in the list of changes that moved numbers', () => {
    const methods = Array.from({ length: METHOD }, (_, i) => String(i + 1))
    expect(firstCells(section(developers, 'Changes that moved numbers'))).toEqual(methods)
  })
})

describe.each(everyDoc)('%s', (file, text) => {
  test('names only commands that package.json has', () => {
    const { scripts } = JSON.parse(read('package.json')) as { scripts: Record<string, string> }
    const commands = [...text.matchAll(/npm run ([\w:-]+)/g)].map(([, name]) => name!)
    expect(commands.length).toBeGreaterThan(0)
    expect(commands.filter((name) => !(name in scripts))).toEqual([])
  })

  test('names only files and folders that exist', () => {
    const looksLikePath =
      /^(?:\.ci|db|docs|public|server|simulator|src|tests)\/[\w./-]*$|^[\w.-]+\.(?:md|json|js|html)$/
    const made = ['secrets.json']
    const inFences = fenced(text).flatMap((code) =>
      [...code.matchAll(/(?:simulator|tests|server)\/[\w./-]+\.ts/g)].map(([name]) => name),
    )
    const names = [...inline(text).flatMap((code) => code.split(' ')), ...inFences].filter(
      (name) => looksLikePath.test(name) && !made.includes(name),
    )
    const linked = [...text.matchAll(/\]\(([^)#]+)\)/g)].map(([, target]) => target!)
    const missing = [...names, ...linked].filter(
      (name) =>
        !existsSync(path.join(projectDir, name)) && !/\b(?:x|YYYYMMDDHHMM_what_changes)\.ts$/.test(name),
    )
    expect(missing).toEqual([])
    if (file === 'DEVELOPERS.md') expect(names.length).toBeGreaterThan(50)
  })

  test('links only to headings that are there', () => {
    const anchors = [...text.matchAll(/^#+ (.+)$/gm)].map(([, title]) =>
      title!
        .toLowerCase()
        .replace(/[^\w\s-]/g, '')
        .replace(/ /g, '-'),
    )
    const wanted = [...text.matchAll(/\]\(#([^)]+)\)/g)].map(([, anchor]) => anchor)
    expect(wanted.filter((anchor) => !anchors.includes(anchor!))).toEqual([])
  })
})
