import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { ferries } from './ferries.ts'

let server: TestHedgerow
let client: pg.Client
let vault: pg.Client
beforeAll(async () => {
  server = await ferries()
  client = await server.connect('ana')
  vault = await server.vault()
})
afterAll(() => server.stop())

async function charges(of: pg.Client = client): Promise<number> {
  return Number((await of.query('SELECT count(*) FROM hedgerow.charges')).rows[0].count)
}

/** The one value of a statement, through the wire and straight from the vault, as text. */
async function both(text: string, values: readonly unknown[]): Promise<readonly [unknown, unknown]> {
  const one = async (on: pg.Client): Promise<unknown> => String(Object.values((await on.query({ text, values: [...values] })).rows[0] as object)[0])
  return [await one(client), await one(vault)]
}

describe('parameters of each common type', () => {
  const cases: readonly (readonly [text: string, values: readonly unknown[]])[] = [
    ['SELECT count(*) FROM trips WHERE fare > $1', [3]],
    ['SELECT count(*) FROM trips WHERE fare > $1::int', ['4']],
    ['SELECT count(*) FROM trips WHERE fare > $1::bigint', ['2147483648']],
    ['SELECT count(*) FROM trips WHERE fare < $1::bigint', ['5']],
    ['SELECT count(*) FROM trips WHERE weight >= $1::numeric', ['4.50']],
    ['SELECT count(*) FROM trips WHERE weight = $1', ['7']],
    ['SELECT count(*) FROM trips WHERE pier = $1', ['p1']],
    ['SELECT count(*) FROM trips WHERE pier = $1', ["p1' OR 'a' = 'a"]],
    ['SELECT count(*) FROM trips WHERE pier = $1', ['\\p1 “ü” \n $$']],
    ['SELECT count(*) FROM riders WHERE concession = $1', [true]],
    ['SELECT count(*) FROM riders WHERE concession IS DISTINCT FROM $1', [true]],
    ['SELECT count(*) FROM riders WHERE $1::bool', [false]],
    ['SELECT count(*) FROM trips WHERE day >= $1', ['2026-03-01']],
    ['SELECT count(*) FROM trips WHERE day BETWEEN $1 AND $2', ['2026-02-01', '2026-02-28']],
    ['SELECT count(*) FROM trips WHERE boarded_at < $1', ['2026-02-01 12:00:00+03']],
    ['SELECT count(*) FROM trips WHERE boarded_at < $1', [new Date('2026-02-01T09:00:00Z')]],
    ['SELECT count(*) FROM trips WHERE fare = $1', [null]],
    ['SELECT count(*) FROM trips WHERE pier IS NOT DISTINCT FROM $1', [null]],
    ['SELECT count(*) FROM trips WHERE pier IN ($1, $2, $1)', ['p1', 'p3']],
    ['SELECT sum(fare) FROM trips WHERE pier LIKE $1', ['p%']],
    ['SELECT count(*) FROM trips WHERE fare > $2 AND weight < $1', ['5', 2]],
  ]
  test.each(cases)('%s with %j', async (text, values) => {
    const [through, straight] = await both(text, values)
    expect(through).toBe(straight)
  })

  test('an array is a list of values, as one parameter or as several', async () => {
    const [whole, straightWhole] = await both('SELECT count(*) FROM trips WHERE pier = ANY ($1)', [['p1', 'p3']])
    expect(whole).toBe(straightWhole)
    const written = 'SELECT count(*) FROM trips WHERE pier = ANY (ARRAY[$1, $2])'
    const [through, straight] = await both(written, ['p1', 'p3'])
    expect(through).toBe(straight)
  })

  test('a value that is none of its type is PostgreSQL’s own complaint, and costs nothing', async () => {
    const before = await charges()
    await expect(client.query('SELECT count(*) FROM trips WHERE fare > $1', ['many'])).rejects.toMatchObject({
      code: '22P02',
      message: 'invalid input syntax for type integer: "many"',
    })
    await expect(client.query('SELECT count(*) FROM trips WHERE fare > $1', [])).rejects.toMatchObject({ code: '42P02' })
    expect(await charges()).toBe(before)
  })
})

test('a parameter after the release, in LIMIT and in the select list keeps its place', async () => {
  const { rows } = await client.query(
    'SELECT pier, count(*) * $1::int AS n, $2::text AS label FROM trips WHERE fare >= $3 GROUP BY pier HAVING count(*) > $4 ORDER BY pier LIMIT $5',
    [2, 'x', 0, 10, 3],
  )
  expect(rows).toEqual([
    { pier: 'p0', n: '1500', label: 'x' },
    { pier: 'p1', n: '1500', label: 'x' },
    { pier: 'p2', n: '1500', label: 'x' },
  ])
})

test('a named prepared statement follows its parameter each time it is executed', async () => {
  const wanted = (await vault.query('SELECT fare, count(*) FROM trips GROUP BY 1 ORDER BY 1')).rows as { fare: number; count: string }[]
  const before = await charges()
  for (let round = 0; round < 3; round += 1)
    for (const { fare, count } of wanted) {
      const { rows } = await client.query({ name: 'by-fare', text: 'SELECT count(*) FROM trips WHERE fare = $1', values: [fare] })
      expect(rows).toEqual([{ count }])
    }
  expect(await charges()).toBe(before + 3 * wanted.length)
})

test('in binary mode a count, an integer and a flag arrive as the types PostgreSQL gives', async () => {
  const binary = await server.connect('ana', { binary: true, types: pg.types } as pg.ClientConfig)
  const { rows, fields } = await binary.query({
    text: 'SELECT district, count(*), 7 AS seven, avg(birth_year) > 1970 AS late FROM riders WHERE birth_year < $1 GROUP BY district ORDER BY 1 LIMIT 1',
    values: [1970],
  })
  expect(fields.map((field) => (field as unknown as { format: string }).format)).toEqual(['binary', 'binary', 'binary', 'binary'])
  const wanted = await vault.query(
    'SELECT district, count(*), 7 AS seven, avg(birth_year) > 1970 AS late FROM riders WHERE birth_year < 1970 GROUP BY district ORDER BY 1 LIMIT 1',
  )
  expect(rows).toEqual(wanted.rows)
})

test('many clients at once each get their own answer', async () => {
  const clients = await Promise.all(Array.from({ length: 6 }, (_, i) => server.connect(i % 2 === 0 ? 'ana' : 'ben')))
  const wanted = new Map(
    (await vault.query('SELECT fare, count(*) FROM trips GROUP BY 1')).rows.map((row: { fare: number; count: string }) => [Number(row.fare), row.count]),
  )
  await Promise.all(
    clients.map(async (each, i) => {
      for (let round = 0; round < 4; round += 1) {
        const fare = (i + round) % 7
        const { rows } = await each.query('SELECT count(*) FROM trips WHERE fare = $1', [fare])
        expect(rows).toEqual([{ count: wanted.get(fare) }])
      }
    }),
  )
})

test('a refusal carries code, hint and position, and the connection goes on', async () => {
  await expect(client.query('SELECT fare FROM trips WHERE fare > $1', [3])).rejects.toMatchObject({
    code: '42501',
    severity: 'ERROR',
    message: expect.stringContaining('[rows.private]') as string,
    hint: expect.stringContaining('SELECT') as string,
    position: '18',
  })
  expect((await client.query('SELECT count(*) FROM riders')).rows).toEqual([{ count: '300' }])
})

test('a notice tells what was spent', async () => {
  const notices: string[] = []
  const each = await server.connect('ana')
  each.on('notice', (notice) => notices.push(notice.message ?? ''))
  await each.query('SELECT count(*) FROM riders')
  expect(notices).toEqual([expect.stringMatching(/^spent epsilon 10{30} \(laplace noise\); /)])
})
