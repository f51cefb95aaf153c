import prettier from 'eslint-config-prettier'
import vue from 'eslint-plugin-vue'
import globals from 'globals'
import tseslint from 'typescript-eslint'

/**
 * Import walls by folder; tests/structure/importDirection.test.ts checks the same on resolved paths.
 * @param {string[]} files
 * @param {Record<string, string>} walls message by pattern (a regular expression on the import's text)
 * @returns {import('typescript-eslint').ConfigArray[number]}
 */
const wall = (files, walls) => ({
  files,
  rules: {
    'no-restricted-imports': [
      'error',
      { patterns: Object.entries(walls).map(([regex, message]) => ({ regex, message })) },
    ],
  },
})

const toServer = { '/server/': 'The server is reached over the wire, through src/shared/contract.' }
const toSimulator = { '/simulator/': 'A bench is reached over the wire, through src/shared/contract.' }
const toClient = { '/src/(?!shared/)': 'Only src/shared is common to all processes.' }
const toDatabase = { '/db/': 'The client and a bench never touch the database.' }
const plain = {
  '^(vue|pinia|vue-router|element-plus|uplot|express|knex|mysql2|socket\\.io|@vueuse/)':
    'src/shared knows no framework.',
  '^node:': 'src/shared runs in the browser too.',
}
const clientLayers = {
  views: '^(\\.\\./)+views/',
  components: '^(\\.\\./)+components/',
  composables: '^(\\.\\./)+composables/',
  stores: '^(\\.\\./)+stores/',
}
/** @param {(keyof typeof clientLayers)[]} upper */
const notUpward = (...upper) =>
  Object.fromEntries(
    upper.map((layer) => [clientLayers[layer], `Imports go downward, never back to ${layer}.`]),
  )

/** @type {Record<string, 'off'>} */
const untypedByNature = {
  '@typescript-eslint/no-unsafe-assignment': 'off',
  '@typescript-eslint/no-unsafe-member-access': 'off',
  '@typescript-eslint/no-unsafe-argument': 'off',
  '@typescript-eslint/no-unsafe-call': 'off',
  '@typescript-eslint/no-unsafe-return': 'off',
}

export default tseslint.config(
  { ignores: ['dist/', 'coverage/', 'node_modules/', '.data*/', 'public/'] },
  ...tseslint.configs.recommendedTypeChecked,
  ...vue.configs['flat/recommended'],
  {
    linterOptions: { reportUnusedDisableDirectives: 'error' },
    languageOptions: {
      parserOptions: {
        parser: tseslint.parser,
        projectService: true,
        tsconfigRootDir: import.meta.dirname,
        extraFileExtensions: ['.vue'],
      },
    },
    rules: {
      '@typescript-eslint/consistent-type-imports': 'error',
      '@typescript-eslint/no-import-type-side-effects': 'error',
      '@typescript-eslint/switch-exhaustiveness-check': [
        'error',
        { considerDefaultExhaustiveForUnions: true },
      ],
      '@typescript-eslint/no-unused-vars': ['error', { argsIgnorePattern: '^_', ignoreRestSiblings: true }],
      '@typescript-eslint/restrict-template-expressions': [
        'error',
        { allowNumber: true, allowBoolean: true },
      ],
      eqeqeq: ['error', 'always', { null: 'ignore' }],
      'no-console': 'error',
      'prefer-const': 'error',
    },
  },
  {
    files: ['src/**/*.{ts,vue}'],
    ignores: ['src/shared/**'],
    languageOptions: { globals: globals.browser },
  },
  {
    files: ['**/*.vue'],
    rules: {
      'vue/multi-word-component-names': 'off',
      'vue/block-lang': ['error', { script: { lang: 'ts' } }],
    },
  },
  // What another .vue file exposes is untyped to this linter; vue-tsc checks it.
  { files: ['**/*.vue'], rules: untypedByNature },
  // Command-line programs speak through standard output.
  {
    files: [
      'server/cli/**',
      'server/main.ts',
      'simulator/**',
      'db/**',
      'tests/perf/**',
      'tests/soak/**',
      'tests/conformance/**',
      'tests/harness/**',
    ],
    rules: { 'no-console': 'off' },
  },
  // The answers of supertest and of raw SQL are untyped by nature; a test's assertions are the check.
  {
    files: ['tests/**'],
    rules: { ...untypedByNature, '@typescript-eslint/unbound-method': 'off' },
  },
  { files: ['**/*.cjs'], ...tseslint.configs.disableTypeChecked },
  {
    files: ['**/*.cjs'],
    languageOptions: { sourceType: 'commonjs', globals: globals.node },
    rules: { ...tseslint.configs.disableTypeChecked.rules, '@typescript-eslint/no-require-imports': 'off' },
  },
  // What JSON.parse and the process give is checked by hand in these dependency-free files.
  {
    files: ['db/**/*.js', '*.config.{js,ts}'],
    rules: untypedByNature,
  },
  wall(['src/views/**', 'src/router/**', 'src/*.{ts,vue}'], { ...toServer, ...toSimulator, ...toDatabase }),
  wall(['src/components/**'], { ...toServer, ...toSimulator, ...toDatabase, ...notUpward('views') }),
  wall(['src/composables/**'], {
    ...toServer,
    ...toSimulator,
    ...toDatabase,
    ...notUpward('views', 'components'),
  }),
  wall(['src/stores/**'], {
    ...toServer,
    ...toSimulator,
    ...toDatabase,
    ...notUpward('views', 'components', 'composables'),
  }),
  wall(['src/api/**'], {
    ...toServer,
    ...toSimulator,
    ...toDatabase,
    ...notUpward('views', 'components', 'composables', 'stores'),
  }),
  wall(['src/shared/**'], { ...toServer, ...toSimulator, ...toDatabase, ...plain }),
  wall(['server/**'], { ...toSimulator, ...toClient }),
  wall(['simulator/**'], { ...toServer, ...toClient, ...toDatabase }),
  wall(['db/migrations/**'], {
    '^(?!knex$|\\./)': 'A migration imports knex only, so that it keeps its meaning.',
  }),
  prettier,
)
