/** Runs the generated cases for longer: `npm run fuzz -- 20000` makes 20,000 of each kind instead of the ordinary number, `npm run fuzz -- 20000 neighbours` only in files so named. */
import { spawnSync } from 'node:child_process'
import { fileURLToPath } from 'node:url'

const [cases = '20000', ...filters] = process.argv.slice(2)
if (!/^[1-9]\d{0,8}$/.test(cases)) {
  console.error(`npm run fuzz -- CASES [FILE…]: ${cases} is no number of cases`)
  process.exit(2)
}
const root = fileURLToPath(new URL('..', import.meta.url))
const { status } = spawnSync(
  process.execPath,
  [
    'node_modules/vitest/vitest.mjs',
    'run',
    '--config',
    '.config/vitest.config.ts',
    '--testTimeout=0',
    ...(filters.length === 0 ? [''] : filters).map((filter) => `test/fuzz/${filter}`),
  ],
  { cwd: root, stdio: 'inherit', env: { ...process.env, HEDGEROW_TEST_CASES: cases } },
)
process.exit(status ?? 1)
