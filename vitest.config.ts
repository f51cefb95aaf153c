import { defineConfig } from 'vitest/config'
import { clientPlugins } from './vite.config.ts'

const withoutDatabase = ['tests/shared/**/*.test.ts', 'tests/structure/**/*.test.ts']
const inPage = ['tests/client/**/*.test.ts']

export default defineConfig({
  test: {
    pool: 'forks',
    maxWorkers: 2,
    projects: [
      {
        extends: true,
        test: { name: 'pure', include: withoutDatabase, environment: 'node' },
      },
      {
        extends: true,
        plugins: clientPlugins(),
        test: {
          name: 'client',
          include: inPage,
          environment: 'happy-dom',
          server: { deps: { inline: ['element-plus'] } },
        },
      },
      {
        extends: true,
        test: {
          name: 'database',
          include: ['tests/**/*.test.ts'],
          exclude: [...withoutDatabase, ...inPage],
          environment: 'node',
          globalSetup: ['tests/global-setup.ts'],
          testTimeout: 20_000,
          hookTimeout: 60_000,
        },
      },
    ],
  },
})
