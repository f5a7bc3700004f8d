import { afterAll, beforeAll, expect, test } from 'vitest'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow

beforeAll(async () => {
  server = await testHedgerow({
    vault: `CREATE TABLE riders (rider_id int PRIMARY KEY, district text NOT NULL);
            CREATE TABLE trips (trip_id int PRIMARY KEY, rider_id int NOT NULL REFERENCES riders, fare int);
            INSERT INTO riders SELECT g, (ARRAY['a','b','c'])[1 + g % 3] FROM generate_series(1, 300) g;
            INSERT INTO trips SELECT g, 1 + g % 300, g % 7 FROM generate_series(1, 3000) g;`,
    policy: `dataset: ferries
schema: public
person: { called: rider, key: riders.rider_id }
defaults: { epsilon: 1e30, delta: 1e-8 }
reply_after: 0.1s
tables:
  riders: { person: rider_id, bounds: { groups: 1, rows: 1 }, columns: { district: { values: [a, b, c, d] } } }
  trips: { person: rider_id, bounds: { groups: 10, rows: 100 }, columns: { fare: { clamp: [0, 10], step: 1 } } }
`,
    analysts: { ana: '{ epsilon: 1e30, delta: 1e-6, renews: never }' },
    everyone: '{ epsilon: 1e31, delta: 1e-5 }',
  })
})
afterAll(() => server.stop())

test('a count at an epsilon so large that no noise is left is the count', async () => {
  const client = await server.connect('ana')
  const { rows } = await client.query('SELECT district, count(*), sum(fare), avg(fare) FROM trips JOIN riders USING (rider_id) GROUP BY district ORDER BY 1')
  console.log(rows)
  console.log((await client.query('EXPLAIN VERBOSE SELECT district, count(*), sum(fare), avg(fare) FROM trips JOIN riders USING (rider_id) GROUP BY district ORDER BY 1')).rows.map(r => r['QUERY PLAN']).join('\n'))
  expect(rows).toHaveLength(4)
})
