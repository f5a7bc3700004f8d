import { availableParallelism } from 'node:os'
import { fileURLToPath } from 'node:url'
import { defineConfig } from 'vitest/config'

export default defineConfig({
  root: fileURLToPath(new URL('..', import.meta.url)),
  cacheDir: fileURLToPath(new URL('../node_modules/.vite', import.meta.url)),
  test: {
    include: ['test/**/*.test.ts'],
    globalSetup: ['test/harness/shared-server.ts'],
    pool: 'forks',
    maxWorkers: Math.max(2, availableParallelism()),
    // a server of one's own holds one lobby at a time: its roles are the whole server's
    fileParallelism: (process.env['HEDGEROW_TEST_DATABASE_URL'] ?? '') === '',
    testTimeout: 30_000,
    hookTimeout: 60_000,
    coverage: { provider: 'v8', include: ['src/**/*.ts'], reportsDirectory: 'coverage' },
  },
})
