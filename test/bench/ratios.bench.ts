import { afterAll, beforeAll, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { demoStatements } from '../../src/demo/statements.ts'
import { BitSource } from '../../src/noise/bits.ts'
import { makeGaussian, makeLaplace } from '../../src/noise/make-mechanism.ts'
import { draw } from '../../src/noise/mechanism.ts'
import { systemRandom } from '../../src/serve/system.ts'
import { ferryBench, type FerryBench } from './ferries.ts'
import { interleaved, ratioLine } from './interleaved.ts'

let bench: FerryBench

beforeAll(async () => {
  bench = await ferryBench()
})
afterAll(() => bench.stop())

/** The vault's SQL of a statement with one block, as EXPLAIN VERBOSE prints it. */
async function vaultSql(statement: string): Promise<string> {
  const { rows } = await bench.through.query<{ 'QUERY PLAN': string }>(`EXPLAIN VERBOSE ${statement}`)
  const [, sql] = /^\s*Vault: ([\s\S]+)$/.exec(rows.at(-1)?.['QUERY PLAN'] ?? '') ?? []
  if (sql === undefined) throw new Error(`EXPLAIN VERBOSE names no SQL for ${statement}`)
  return sql
}

const statements = demoStatements.filter(({ outcome }) => outcome === 'private answer').map(({ sql }) => sql.replace(/^CREATE TEMP TABLE \w+ AS\s+/, ''))

test('the vault: bounded SQL against the same question asked raw', async () => {
  const lines: string[] = []
  for (const statement of statements) {
    const bounded = await vaultSql(statement)
    const times = await interleaved(7, { bounded: () => bench.vault.query(bounded), raw: () => bench.vault.query(statement) })
    lines.push(ratioLine(statement.replace(/\s+/g, ' ').slice(0, 70), times.bounded, times.raw))
    expect(times.raw).toBeGreaterThan(0)
  }
  report('bounded SQL in the vault, against the statement itself on the same rows', lines)
})

test('outside the vault: reading, planning, the debit on a durable ledger, the lobby and the wire', async () => {
  const statement = 'SELECT concession, count(*) FROM riders GROUP BY concession'
  const bounded = await vaultSql(statement)
  const times = await interleaved(25, {
    private: () => bench.through.query(statement),
    vault: () => bench.vault.query(bounded),
    explain: () => bench.through.query(`EXPLAIN ${statement}`),
    plain: () => bench.direct.query('SELECT 1'),
  })
  const outside = times.private - bench.replyAfterMs
  report(`a private statement, beside the ${bench.replyAfterMs} ms at whose end it is answered (the vault works and noise is drawn within them)`, [
    ratioLine('what is left of the statement, against its SQL in the vault', outside, times.vault),
    ratioLine('what is left of the statement, against SELECT 1 without Hedgerow', outside, times.plain),
    ratioLine('EXPLAIN (reads and plans, debits nothing), against SELECT 1', times.explain, times.plain),
  ])
  expect(outside).toBeGreaterThan(0)
})

test('noise: exact draws', async () => {
  const bits = new BitSource(systemRandom)
  const scale = Fraction.make(200n)
  const [gaussian, laplace] = [makeGaussian(scale.mul(scale)), makeLaplace(scale)]
  const thousand = (mechanism: typeof gaussian | typeof laplace) => async () => {
    for (let i = 0; i < 1000; i++) draw(mechanism, bits)
  }
  const times = await interleaved(15, { gaussian: thousand(gaussian), laplace: thousand(laplace), plain: () => bench.direct.query('SELECT 1') })
  report('1,000 draws of noise', [
    ratioLine('discrete Gaussian, sigma 200, against SELECT 1', times.gaussian, times.plain),
    ratioLine('discrete Laplace, scale 200, against SELECT 1', times.laplace, times.plain),
  ])
})

test('the wire: what names no private table, against a connection without Hedgerow', async () => {
  const lines: string[] = []
  const compare = async (what: string, rounds: number, run: (client: FerryBench['through']) => Promise<unknown>): Promise<void> => {
    const times = await interleaved(rounds, { through: () => run(bench.through), direct: () => run(bench.direct) })
    lines.push(ratioLine(what, times.through, times.direct))
  }
  await compare('SELECT 1', 2000, (client) => client.query('SELECT 1'))
  await compare('SELECT $1::int, with a parameter', 2000, (client) => client.query('SELECT $1::int', [7]))
  await compare('SELECT $1::int, prepared once', 2000, (client) => client.query({ name: 'seven', text: 'SELECT $1::int', values: [7] }))
  await compare('a published table of 9 rows', 1000, (client) => client.query('SELECT * FROM piers'))
  await compare('200,000 rows', 9, (client) => client.query("SELECT g, repeat('x', 40) FROM generate_series(1, 200000) AS g"))
  report('pass-through', lines)
})

function report(title: string, lines: readonly string[]): void {
  console.log(`\n${title}\n${lines.map((line) => `  ${line}`).join('\n')}`)
}
