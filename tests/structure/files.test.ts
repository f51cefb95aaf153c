import { expect, test } from 'vitest'
import { contentOf, projectFiles } from '../helpers/sources.ts'

const files = projectFiles()

/** Beside these the top level holds only what tools need. */
const TOP_LEVEL = [
  'README.md',
  'DEVELOPERS.md',
  'package.json',
  'package-lock.json',
  'vite.config.ts',
  'vitest.config.ts',
  'tsconfig.json',
  'tsconfig.base.json',
  'eslint.config.js',
  'index.html',
  'src',
  'server',
  'simulator',
  'db',
  'tests',
  'docs',
  'public',
  '.ci',
  '.gitignore',
  '.prettierrc.json',
  '.prettierignore',
]

const isText = (file: string) => !/\.(png|jpe?g|webp|ico|woff2?|wav|bin|gz)$/.test(file)

test('the top level holds only its fixed entries', () => {
  const entries = [...new Set(files.map((file) => file.split('/')[0]))]
  expect(entries.filter((entry) => !TOP_LEVEL.includes(entry ?? ''))).toEqual([])
})

test('no tracked file names the host of a package registry', () => {
  // Put together here, so that this file does not hold what it looks for.
  const hosts = new RegExp(
    ['npm' + 'js', 'yarn' + 'pkg', 'deb\\.' + 'debian', 'security\\.' + 'debian'].join('|'),
    'i',
  )
  expect(files.filter((file) => isText(file) && hosts.test(contentOf(file)))).toEqual([])
})

test('the lock file holds no address of a package', () => {
  expect(contentOf('package-lock.json')).not.toMatch(/"resolved":/)
})

test('every dependency is pinned to one exact version', () => {
  const { dependencies, devDependencies } = JSON.parse(contentOf('package.json')) as Record<
    'dependencies' | 'devDependencies',
    Record<string, string>
  >
  for (const [name, version] of Object.entries({ ...dependencies, ...devDependencies }))
    expect(version, name).toMatch(/^\d+\.\d+\.\d+$/)
})

test('no test is switched off and no check is silenced', () => {
  const silenced = new RegExp(
    [
      '\\b(it|test|describe)\\.(on' + 'ly|sk' + 'ip|to' + 'do)\\b',
      '@ts-(ig' + 'nore|no' + 'check)',
      'eslint-dis' + 'able',
    ].join('|'),
  )
  const sources = files.filter((file) => /^(src|server|simulator|db|tests)\/.*\.(ts|js|cjs|vue)$/.test(file))
  expect(sources.filter((file) => silenced.test(contentOf(file)))).toEqual([])
})

test('the page holds no inline script and no inline style', () => {
  const page = contentOf('index.html')
  expect(page).toMatch(/<div id="app"><\/div>/)
  expect(page).not.toMatch(/<style|style=|\son\w+=/)
  for (const [script] of page.matchAll(/<script[^>]*>[\s\S]*?<\/script>/g))
    expect(script).toMatch(/^<script(?: type="module")? src="[^"]+"><\/script>$/)
})
