import { fileURLToPath } from 'node:url'
import { defineConfig } from 'vite'
import { clientPlugins } from '../../vite.config.ts'

const here = (name: string) => fileURLToPath(new URL(name, import.meta.url))

/** The screens with made-up data: both files that touch the network are replaced. `npx vite tests/harness`. */
export default defineConfig({
  root: here('.'),
  plugins: [
    {
      name: 'no-network',
      enforce: 'pre',
      resolveId(source) {
        if (/\/api\/http\.ts$/.test(source)) return here('./fakeHttp.ts')
        if (/\/api\/socket\.ts$/.test(source)) return here('./fakeSocket.ts')
        return null
      },
    },
    ...clientPlugins(),
  ],
  cacheDir: here('../../node_modules/.cache/harness'),
  server: {
    host: '127.0.0.1',
    port: Number(process.env.PORT ?? 14655),
    strictPort: true,
    fs: { allow: [here('../..')] },
  },
})
