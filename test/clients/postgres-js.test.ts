import postgres from 'postgres'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { passwordOf, type TestHedgerow } from '../harness/hedgerow.ts'
import { ferries } from './ferries.ts'

let server: TestHedgerow
let sql: postgres.Sql
const notices: string[] = []
beforeAll(async () => {
  server = await ferries()
  sql = postgres({
    host: '127.0.0.1',
    port: server.hedgerow.port,
    user: 'ana',
    pass: passwordOf('ana'),
    database: server.dataSet,
    max: 3,
    onnotice: (notice) => notices.push(notice['message'] ?? ''),
  })
})
afterAll(async () => {
  await sql.end({ timeout: 2 })
  await server.stop()
})

test('a tagged statement is prepared, described and executed with parameters of their own types', async () => {
  const least = 3
  const rows =
    await sql`SELECT pier, count(*)::int AS trips, avg(fare) AS mean FROM trips WHERE fare >= ${least} AND day < ${new Date('2026-05-01')} GROUP BY pier ORDER BY pier`
  const vault = await server.vault()
  const wanted = await vault.query(
    `SELECT pier, count(*)::int AS trips, avg(fare) AS mean FROM trips WHERE fare >= 3 AND day < '2026-05-01' GROUP BY pier ORDER BY pier`,
  )
  expect(rows.slice(0, 4).map((row) => ({ ...row }))).toEqual(wanted.rows)
  expect(notices.at(-1)).toContain('spent epsilon')
})

test('the same prepared statement follows its parameter', async () => {
  const vault = await server.vault()
  for (const fare of [0, 1, 2, 3, 2, 1]) {
    const [row] = await sql`SELECT count(*) FROM trips WHERE fare = ${fare}`
    expect(row?.['count']).toBe((await vault.query('SELECT count(*) FROM trips WHERE fare = $1', [fare])).rows[0].count)
  }
})

test('transactions, savepoints, cursors and a refusal inside them behave as in PostgreSQL', async () => {
  const seen = await sql.begin(async (inside) => {
    await inside`CREATE TEMP TABLE by_pier ON COMMIT DROP AS SELECT pier, count(*) AS trips FROM trips GROUP BY pier`
    await inside.savepoint(async (deeper) => await deeper`SELECT * FROM riders`).catch((problem: unknown) => expect(problem).toMatchObject({ code: '42501' }))
    return await inside`SELECT count(*)::int AS piers FROM by_pier WHERE trips > 0`
  })
  expect(seen[0]).toEqual({ piers: 4 })
  const batches: number[] = []
  await sql`SELECT day, count(*) FROM trips GROUP BY day ORDER BY day`.cursor(100, (rows) => void batches.push(rows.length))
  expect(batches[0]).toBe(100)
  expect(batches.reduce((sum, each) => sum + each, 0)).toBeGreaterThanOrEqual(125)
})

test('describe answers without a release', async () => {
  const before = await sql`SELECT count(*)::int AS n FROM hedgerow.charges`
  const { types, columns } = (await sql`SELECT day, avg(weight) FROM trips WHERE fare > ${1} GROUP BY day`.describe()) as unknown as {
    types: number[]
    columns: { name: string; type: number }[]
  }
  expect(types).toEqual([23])
  expect(columns.map(({ name, type }) => [name, type])).toEqual([
    ['day', 1082],
    ['avg', 1700],
  ])
  expect(await sql`SELECT count(*)::int AS n FROM hedgerow.charges`).toEqual(before)
})

test('pipelined statements over few connections each get their own answer', async () => {
  const answers = await Promise.all(
    Array.from({ length: 21 }, (_, i) => sql`SELECT ${i}::int AS asked, count(*)::int AS n FROM riders WHERE birth_year >= ${1950 + i}`),
  )
  for (const [i, rows] of answers.entries()) expect(rows[0]).toEqual({ asked: i, n: 300 - 6 * i })
})

test('a refused statement rejects with its code and hint, and the pool goes on', async () => {
  await expect(sql`SELECT district FROM riders WHERE birth_year = ${1960}`).rejects.toMatchObject({
    code: '42501',
    hint: expect.stringContaining('SELECT') as string,
  })
  expect(await sql`SELECT count(*)::int AS n FROM riders`).toMatchObject([{ n: 300 }])
})
