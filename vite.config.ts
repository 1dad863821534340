import { existsSync } from 'node:fs'
import { reactRouter } from '@react-router/dev/vite'
import tailwindcss from '@tailwindcss/vite'
import { defineConfig } from 'vite'

// One file for three uses: the application, its server threads (LAVANT_BUILD=threads) and Vitest.
const testing = Boolean(process.env.VITEST)
const threads = process.env.LAVANT_BUILD === 'threads'
const inBrowser = process.env.LAVANT_TESTS === 'browser'

const threadSources = Object.entries({
  solve: 'app/solver/solve.thread.ts',
  import: 'app/readings/import.thread.ts',
  draw: 'app/packages/draw.thread.ts',
  second: 'app/solver/linear/second.thread.ts',
}).filter(([, source]) => existsSync(source))

export default defineConfig({
  plugins: testing || threads ? [] : [tailwindcss(), reactRouter()],
  resolve: { tsconfigPaths: true },
  server: { host: '127.0.0.1' },
  build: threads
    ? {
        ssr: true,
        outDir: 'build/threads',
        target: 'node20',
        rollupOptions: {
          input: Object.fromEntries(threadSources),
          output: { entryFileNames: '[name].js' },
        },
      }
    : // The grid and the charts, each loaded only by the pages that show one.
      { chunkSizeWarningLimit: 1500 },
  test: {
    // Browser tests are a run of their own: they share one built application and take turns on it.
    include: inBrowser ? ['test/browser/**/*.test.ts'] : ['app/**/*.test.{ts,tsx}', 'test/**/*.test.ts'],
    exclude: inBrowser ? [] : ['test/browser/**'],
    fileParallelism: !inBrowser,
    globalSetup: ['test/kernels.ts'],
    setupFiles: ['test/stray-errors.ts'],
    environment: 'node',
    testTimeout: inBrowser ? 180_000 : 60_000,
    hookTimeout: 120_000,
  },
} as Parameters<typeof defineConfig>[0])
