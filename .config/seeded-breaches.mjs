/** Shows that the checks catch what they are there for: files that break one rule each are put into a copy of src, and every one must be complained of under its rule's name. */
import { execFileSync } from 'node:child_process'
import { cpSync, mkdirSync, mkdtempSync, rmSync, symlinkSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'

const root = fileURLToPath(new URL('..', import.meta.url))

/** Rule, file, text. */
const layerBreaches = [
  ['order-base', 'base/breach.ts', "import '../sql/tree.ts'"],
  ['order-sql', 'sql/breach.ts', "import '../catalog/catalog.ts'"],
  ['order-catalog', 'catalog/breach.ts', "import type { DataSet } from '../policy/data-set.ts'\nexport type Breach = DataSet"],
  ['order-policy', 'policy/breach.ts', "import '../budget/ledger.ts'"],
  ['order-plan', 'plan/breach.ts', "import '../answer/ports.ts'"],
  ['order-bound', 'bound/breach.ts', "import '../budget/ledger.ts'"],
  ['order-noise', 'noise/breach.ts', "import '../budget/ledger.ts'"],
  ['order-budget', 'budget/breach.ts', "import '../answer/ports.ts'"],
  ['order-release', 'release/breach.ts', "import '../answer/ports.ts'"],
  ['order-answer', 'answer/breach.ts', "import '../embedded/server.ts'"],
  ['apart-wire', 'wire/breach.ts', "import '../vault/seeded.ts'"],
  ['apart-embedded', 'embedded/breach.ts', "import '../vault/seeded.ts'"],
  ['pure-plan', 'plan/breach-io.ts', "import { readFileSync } from 'node:fs'\nexport const breach = readFileSync"],
  ['sole-user-libpg-query', 'wire/breach-parser.ts', "import 'libpg-query'"],
  ['sole-user-pg', 'answer/breach-pg.ts', "import 'pg'"],
  ['one-door', 'wire/breach-exact.ts', "import type { ExactTable } from '../release/exact.ts'\nexport type Breach = ExactTable"],
  ['bounded-door', 'wire/breach-bounded.ts', "import type { BoundedQuery } from '../bound/bounded-query.ts'\nexport type Breach = BoundedQuery"],
  ['vault-door', 'serve/breach-run.ts', "import { runQuery } from '../vault/run.ts'\nexport const breach = runQuery"],
  ['settings-at-the-top', 'vault/breach-settings.ts', "import '../settings.ts'"],
  ['joints-are-ends', 'vault/breach-joint.ts', "import '../demo/schema.ts'"],
  ['no-dev-packages', 'vault/breach-dev.ts', "import 'fast-check'"],
  ['no-unknown', 'vault/breach-unknown.ts', "import 'not-installed-anywhere'"],
  ['no-circle', 'base/breach-circle.ts', "import './breach-circle-back.ts'"],
]
const lintBreaches = [
  ['eslint(no-restricted-globals)', 'noise/breach-number.ts', 'export const breach = Math.random()'],
  ['node(no-process-env)', 'vault/breach-environment.ts', 'export const breach = process.env'],
  ['typescript(no-floating-promises)', 'vault/breach-promise.ts', 'export function breach(): void {\n  Promise.resolve(1)\n}'],
  [
    'typescript(switch-exhaustiveness-check)',
    'plan/breach-switch.ts',
    "export function breach(kind: 'a' | 'b'): number {\n  switch (kind) {\n    case 'a':\n      return 1\n  }\n  return 2\n}",
  ],
  ['typescript(no-explicit-any)', 'base/breach-any.ts', 'export const breach: any = 1'],
  ['import(no-default-export)', 'base/breach-default.ts', 'export default 1'],
]
/** Error of the compiler, file, text: the doors that types hold. */
const typeBreaches = [
  [
    'TS2345',
    'vault/breach-text.ts',
    "import type { Vault } from './ask.ts'\nexport const breach = (vault: Vault) => vault.ask({ text: 'select 1', keyCount: 0, totalCount: 1 }, options)\ndeclare const options: Parameters<Vault['ask']>[1]",
  ],
  [
    'TS2673',
    'vault/breach-query.ts',
    "import { BoundedQuery } from '../bound/bounded-query.ts'\nexport const breach = new BoundedQuery('select 1', tree, 0, 1)\ndeclare const tree: BoundedQuery['tree']",
  ],
  ['TS2339', 'release/breach-exact.ts', "import type { ExactTable } from './exact.ts'\nexport const breach = (table: ExactTable) => table.rows"],
  ['TS2739', 'release/breach-debit.ts', "import type { Debit } from '../budget/debit.ts'\nexport const breach: Debit = { use: () => '1' }"],
  [
    'TS2741',
    'release/breach-mechanism.ts',
    "import { Fraction } from '../base/fraction.ts'\nimport type { LaplaceMechanism } from '../noise/make-mechanism.ts'\nexport const breach: LaplaceMechanism = { kind: 'laplace', scale: Fraction.one }",
  ],
]
/** What the breaches lean on, harmless by itself. */
const props = [
  ['vault/seeded.ts', 'export const seeded = 1'],
  ['base/breach-circle-back.ts', "import './breach-circle.ts'"],
]

const scratch = mkdtempSync(join(tmpdir(), 'hedgerow-breaches-'))
try {
  for (const name of ['src', 'tsconfig.json', 'package.json', '.oxlintrc.json', '.config']) cpSync(join(root, name), join(scratch, name), { recursive: true })
  symlinkSync(join(root, 'node_modules'), join(scratch, 'node_modules'))
  for (const [file, text] of [...props, ...[...layerBreaches, ...lintBreaches, ...typeBreaches].map((breach) => breach.slice(1))]) {
    mkdirSync(dirname(join(scratch, 'src', file)), { recursive: true })
    writeFileSync(join(scratch, 'src', file), `${text}\n`)
  }
  const layers = JSON.parse(run('dependency-cruiser/bin/dependency-cruise.mjs', ['src', '--config', '.config/layers.mjs', '--output-type', 'json'])).summary
    .violations
  const lint = run('oxlint/bin/oxlint', ['-f', 'unix', ...lintBreaches.map(([, file]) => join('src', file))]).split('\n')
  const types = run('typescript/bin/tsc', ['-p', typeBreachesProject()]).split('\n')
  const missed = [
    ...layerBreaches.filter(
      ([rule, file]) =>
        !layers.some(({ from, rule: { name }, cycle = [] }) => name === rule && [from, ...cycle.map((each) => each.name)].includes(`src/${file}`)),
    ),
    ...lintBreaches.filter(([rule, file]) => !lint.some((line) => line.includes(`src/${file}:`) && line.includes(rule))),
    ...typeBreaches.filter(([error, file]) => !types.some((line) => line.includes(`src/${file}(`) && line.includes(` ${error}:`))),
  ]
  for (const [rule, file] of missed) console.error(`not caught: ${rule} in src/${file}`)
  const seeded = layerBreaches.length + lintBreaches.length + typeBreaches.length
  console.log(`${seeded - missed.length} of ${seeded} seeded breaches caught`)
  process.exitCode = missed.length === 0 ? 0 : 1
} finally {
  rmSync(scratch, { recursive: true, force: true })
}

/** A project of those files alone, and what they import. */
function typeBreachesProject() {
  const path = join(scratch, 'tsconfig.breaches.json')
  writeFileSync(path, JSON.stringify({ extends: './tsconfig.json', include: [], files: typeBreaches.map(([, file]) => join('src', file)) }))
  return path
}

/** A tool's output; these tools end with an error code where they complain. */
function run(tool, args) {
  try {
    return execFileSync(process.execPath, [join(root, 'node_modules', tool), ...args], {
      cwd: scratch,
      encoding: 'utf8',
      maxBuffer: 64 * 1024 * 1024,
      stdio: ['ignore', 'pipe', 'inherit'],
    })
  } catch (error) {
    if (typeof error.stdout === 'string' && error.stdout !== '') return error.stdout
    throw error
  }
}
