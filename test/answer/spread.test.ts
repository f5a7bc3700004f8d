import { afterAll, beforeAll, expect, test } from 'vitest'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow

beforeAll(async () => {
  server = await testHedgerow({
    vault: `CREATE TABLE riders (rider_id int PRIMARY KEY, age int);
            CREATE TABLE trips (trip_id int PRIMARY KEY, rider_id int NOT NULL REFERENCES riders, fare int, delay numeric(5,1), speed float8);
            INSERT INTO riders SELECT g, g % 90 FROM generate_series(1, 300) g;
            INSERT INTO trips SELECT g, 1 + g % 300, g % 7 - 3, (g % 31) / 2.0, g % 11 FROM generate_series(1, 3000) g;`,
    policy: `dataset: ferries
schema: public
person: { called: rider, key: riders.rider_id }
defaults: { epsilon: 1e30, delta: 1e-8 }
reply_after: 0.1s
tables:
  riders: { person: rider_id, bounds: { groups: 1, rows: 1 }, columns: { age: { clamp: [0, 100] } } }
  trips:
    person: rider_id
    bounds: { groups: 10, rows: 100 }
    columns: { fare: { clamp: [-10, 10], step: 1 }, delay: { clamp: [0, 20], step: 0.5 }, speed: { clamp: [0, 20], step: 0.25 } }
`,
    analysts: { ana: '{ epsilon: 1e32, delta: 1e-6, renews: never }' },
    everyone: '{ epsilon: 1e33, delta: 1e-5 }',
  })
})
afterAll(() => server.stop())

test('variances and deviations without noise are those PostgreSQL gives, over one row and many rows a person', async () => {
  const client = await server.connect('ana')
  const vault = await server.vault()
  for (const [column, table] of [
    ['fare', 'trips'],
    ['delay', 'trips'],
    ['speed', 'trips'],
    ['age', 'riders'],
  ] as const) {
    const sql = `SELECT var_pop(${column}), var_samp(${column}), variance(${column}), stddev_pop(${column}), stddev_samp(${column}), stddev(${column}) FILTER (WHERE ${column} > 1) AS filtered FROM ${table}`
    const own = (await client.query<Record<string, string>>(sql)).rows[0] ?? {}
    const exact = (await vault.query<Record<string, string>>(sql)).rows[0] ?? {}
    expect(Object.keys(own)).toEqual(Object.keys(exact))
    for (const [name, value] of Object.entries(exact)) expect(Number(own[name]), `${name}(${column})`).toBeCloseTo(Number(value), 9)
  }
})
