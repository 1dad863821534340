import { reactRouter } from '@react-router/dev/vite'
import tailwindcss from '@tailwindcss/vite'
import { defineConfig } from 'vite'

// One file for three uses: the application, its server threads (LAVANT_BUILD=threads) and Vitest.
const testing = Boolean(process.env.VITEST)
const threads = process.env.LAVANT_BUILD === 'threads'

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
          input: {
            solve: 'app/solver/solve.thread.ts',
            import: 'app/readings/import.thread.ts',
            draw: 'app/packages/draw.thread.ts',
          },
          output: { entryFileNames: '[name].js' },
        },
      }
    : undefined,
  test: {
    include: ['app/**/*.test.{ts,tsx}', 'test/**/*.test.ts'],
    exclude: ['test/browser/**', 'node_modules/**'],
    environment: 'node',
    testTimeout: 60_000,
    hookTimeout: 120_000,
  },
} as Parameters<typeof defineConfig>[0])
