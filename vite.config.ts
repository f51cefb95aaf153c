import vue from '@vitejs/plugin-vue'
import Components from 'unplugin-vue-components/vite'
import { ElementPlusResolver } from 'unplugin-vue-components/resolvers'
import { defineConfig } from 'vite'
import type { PluginOption } from 'vite'

const apiUrl = process.env.EVENSTRUNG_URL ?? 'http://127.0.0.1:4181'

export const clientPlugins = (): PluginOption[] => [
  vue(),
  // Only Element Plus is found by name; the project's own components are imported where they are used.
  Components({ dirs: [], dts: false, resolvers: [ElementPlusResolver({ importStyle: 'css' })] }),
]

export default defineConfig({
  plugins: clientPlugins(),
  build: {
    outDir: 'dist/client',
    emptyOutDir: true,
    target: 'es2022',
    sourcemap: false,
    // The page's content security policy allows files of its own origin only, no data: addresses for fonts.
    assetsInlineLimit: 0,
    modulePreload: { polyfill: false },
  },
  server: {
    host: process.env.HOST ?? '127.0.0.1',
    port: Number(process.env.PORT ?? 4180),
    strictPort: true,
    proxy: {
      '/api': { target: apiUrl },
      '/socket.io': { target: apiUrl, ws: true },
    },
  },
})
