import { afterAll, beforeAll, expect, test } from 'vitest'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow

beforeAll(async () => {
  server = await testHedgerow({
    vault: `CREATE TABLE riders (rider_id int PRIMARY KEY, district text NOT NULL, born bigint, joined date);
            INSERT INTO riders SELECT g, (ARRAY['a','b''c','d"e'])[1 + g % 3], 9007199254740990 + g % 4, date '2025-01-01' + g % 5 FROM generate_series(1, 60) g;`,
    policy: `dataset: ferries
schema: public
person: { called: rider, key: riders.rider_id }
defaults: { epsilon: 1e30, delta: 1e-8 }
reply_after: 0.1s
tables:
  riders: { person: rider_id, bounds: { groups: 1, rows: 1 }, columns: { district: {}, born: {}, joined: {} } }
`,
    analysts: { ana: '{ epsilon: 1e33, delta: 1e-6, renews: never }' },
    everyone: '{ epsilon: 1e34, delta: 1e-5 }',
  })
})
afterAll(() => server.stop())

const lists: readonly (readonly [column: string, type: string, values: readonly (string | null)[] | null])[] = [
  ['district', 'text[]', ['a', "b'c"]],
  ['district', 'text[]', ['d"e', null]],
  ['district', 'text[]', []],
  ['district', 'text[]', null],
  ['born', 'bigint[]', ['9007199254740993', '9007199254740991']],
  ['joined', 'date[]', ['2025-01-02', '2025-01-05']],
]

test.each(lists)('%s = ANY ($1) with a %s of %j counts what PostgreSQL counts', async (column, type, values) => {
  const [client, vault] = [await server.connect('ana'), await server.vault()]
  const sql = `SELECT count(*) FROM riders WHERE ${column} = ANY ($1)`
  const exact = (await vault.query<{ count: string }>(sql, [values])).rows[0]?.count
  expect((await client.query<{ count: string }>(sql, [values])).rows[0]?.count).toBe(exact)
  const cast = `SELECT count(*) FROM riders WHERE NOT ${column} = ANY ($1::${type})`
  expect((await client.query<{ count: string }>(cast, [values])).rows[0]?.count).toBe((await vault.query<{ count: string }>(cast, [values])).rows[0]?.count)
})
