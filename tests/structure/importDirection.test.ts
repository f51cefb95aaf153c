import { expect, test } from 'vitest'
import { allImports, importsIn } from '../helpers/sources.ts'
import type { Import } from '../helpers/sources.ts'

interface Wall {
  /** Which files the wall stands around. */
  inside: RegExp
  /** Which of the project's files they may import; undefined: any. */
  files?: RegExp
  /** Which packages and modules of Node.js they may import; undefined: any. */
  packages?: RegExp
}

const WALLS: Record<string, Wall> = {
  'src/shared imports nothing outside itself': { inside: /^src\/shared\//, files: /^src\/shared\// },
  'src/shared/contract imports zod only': { inside: /^src\/shared\/contract\//, packages: /^zod$/ },
  'src/shared measures with no package but a distributions library': {
    inside: /^src\/shared\/(?!contract\/)/,
    packages: /^jstat$/,
  },
  'the client imports itself and src/shared': { inside: /^src\//, files: /^src\// },
  'the client imports no module of Node.js': { inside: /^src\//, packages: /^(?!node:)/ },
  'the client keeps sockets and HTTP in src/api': {
    inside: /^src\/(?!api\/)/,
    packages: /^(?!socket\.io-client$)/,
  },
  'components do not import views': {
    inside: /^src\/components\//,
    files: /^src\/(?!views\/|router\/)/,
  },
  'composables do not import components or views': {
    inside: /^src\/composables\//,
    files: /^src\/(?!views\/|components\/|router\/)/,
  },
  'stores import stores, api, shared and plain files': {
    inside: /^src\/stores\//,
    files: /^src\/(stores\/|api\/|shared\/|[^/]+\.ts$)/,
  },
  'api imports api, shared and plain files': {
    inside: /^src\/api\//,
    files: /^src\/(api\/|shared\/|[^/]+\.ts$)/,
  },
  'the server imports itself, src/shared and the migrations': {
    inside: /^server\//,
    files: /^(server|src\/shared|db\/migrations|db\/seeds)\//,
  },
  'queries know no HTTP and no socket': {
    inside: /^server\/.*\.queries\.ts$/,
    packages: /^(?!express$|socket\.io$|cookie$)/,
  },
  'services know no HTTP': { inside: /^server\/.*\.service\.ts$/, packages: /^(?!express$|cookie$)/ },
  'queries import no service, route or gateway': {
    inside: /^server\/.*\.queries\.ts$/,
    files: /^(?!.*\.(service|routes|gateway)\.ts$)/,
  },
  'services import no route or gateway': {
    inside: /^server\/.*\.service\.ts$/,
    files: /^(?!.*\.(routes|gateway)\.ts$)/,
  },
  'a bench imports itself and src/shared': {
    inside: /^simulator\//,
    files: /^(simulator|src\/shared)\//,
  },
  'a migration imports knex and its neighbours only': {
    inside: /^db\/migrations\//,
    files: /^db\/migrations\//,
    packages: /^knex$/,
  },
  'the launcher needs no package, but esbuild for building': {
    inside: /^db\/(?!migrations\/|seeds\/).*\.js$/,
    packages: /^(node:|esbuild$)/,
  },
}

function breaks(wall: Wall, { from, wanted, target }: Import): boolean {
  if (!wall.inside.test(from)) return false
  if (target !== undefined) return wall.files !== undefined && !wall.files.test(target)
  return wall.packages !== undefined && !wall.packages.test(wanted)
}

const imports = allImports()

test('the scan finds imports of every kind', () => {
  const found = importsIn(
    'src/views/A.vue',
    `<script setup lang="ts">
import { a,
  b } from './b.ts'
import type { C } from "../c.ts"
import 'element-plus/x.css'
export { d } from './d.ts'
const e = () => import('./E.vue')
// import f from './f.ts'
</script><template>import x from './no.ts'</template>`,
  )
  expect(found.map(({ wanted, target, typeOnly }) => [wanted, target, typeOnly])).toEqual([
    ['./b.ts', 'src/views/b.ts', false],
    ['../c.ts', 'src/c.ts', true],
    ['element-plus/x.css', undefined, false],
    ['./d.ts', 'src/views/d.ts', false],
    ['./E.vue', 'src/views/E.vue', false],
  ])
  expect(imports.length).toBeGreaterThan(50)
})

test.each(Object.entries(WALLS))('%s', (_, wall) => {
  const broken = imports.filter((found) => breaks(wall, found))
  expect(broken.map(({ from, wanted }) => `${from} imports ${wanted}`)).toEqual([])
})
