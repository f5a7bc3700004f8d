import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { hostileWorld, outcomeOf } from './world.ts'

let server: TestHedgerow
let ana: pg.Client
let vault: pg.Client

beforeAll(async () => {
  server = await hostileWorld()
  ana = await server.connect('ana')
  vault = await server.vault()
})
afterAll(() => server.stop())

/** Each is refused for its text alone, or answered whatever the rows are: here once with plain rows and once with the worst that their types hold. */
const statements: readonly string[] = [
  'SELECT fare::float8 * 1e300 * 1e300 AS k, count(*) FROM trips GROUP BY 1',
  'SELECT count(*) FROM trips WHERE fare::float8 * 1e300 * 1e300 > delay',
  'SELECT count(*) FROM trips WHERE fare::float8 * 1e200 > delay',
  'SELECT count(*) FROM trips WHERE delay / 1e200 / 1e200 > weight',
  'SELECT count(*) FROM trips WHERE fare / 3.0 IN (delay, weight, 1)',
  'SELECT count(*) FROM trips WHERE nullif(fare / 3.0, delay) > 1',
  'SELECT count(*) FROM trips WHERE tip + 0 > delay',
  'SELECT count(*) FROM trips WHERE tip > 5 AND exact < 7',
  'SELECT sum(tip), avg(exact), sum(weight), avg(delay) FROM trips',
  `SELECT sum(fare * extract(year FROM 'infinity'::timestamptz)) FROM trips`,
  `SELECT sum(extract(year FROM boarded + interval 'infinity')) FROM trips`,
  `SELECT count(*) FROM trips WHERE boarded + interval '200000 years' > now()`,
  'SELECT count(*) FROM riders WHERE nick = motto',
  `SELECT count(*) FROM riders WHERE lower(nick || motto) = 'a'`,
  'SELECT count(*) FROM riders WHERE CASE WHEN rider_id = 7 THEN nick ELSE motto END > district',
  `SELECT count(*) FROM riders WHERE nick || district LIKE 'a%'`,
  `SELECT sum(length(nick)) FROM riders`,
  'SELECT sum(fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare * fare) FROM trips',
  'SELECT count(*) FROM trips WHERE trip_id * trip_id * trip_id > 1 OR trip_id + 1 > 0 OR -trip_id > 0 OR abs(trip_id) > 0',
  `SELECT count(*) FROM trips WHERE ${Array.from({ length: 4096 }, () => 'trip_id').join(' * ')} > 1`,
  "SELECT sum(DATE '5874897-12-31' - joined) FROM riders",
  "SELECT date_trunc('month', boarded), sum(exact / fare), sum(fare % bundle) FROM trips GROUP BY 1",
]

const worst = `
  UPDATE trips SET delay = (ARRAY['NaN','Infinity','-Infinity','1e308','1e-320',NULL])[1 + trip_id % 6]::float8, weight = (ARRAY['NaN','Infinity','-Infinity','3e38','1e-45',NULL])[1 + trip_id % 6]::float4,
    tip = (ARRAY['NaN','Infinity','-Infinity','1e400','1e-400',NULL])[1 + trip_id % 6]::numeric, exact = (ARRAY['NaN','99999999.99','-99999999.99','0',NULL,'1'])[1 + trip_id % 6]::numeric,
    fare = (ARRAY[2147483647,-2147483648,0,NULL,10,-1])[1 + trip_id % 6], bundle = (ARRAY[2147483647,-2147483648,0,NULL,-1,1])[1 + trip_id % 6],
    boarded = (ARRAY['infinity','-infinity','4713-01-01 BC','294276-12-31 23:59:59',NULL,'2025-06-01'])[1 + trip_id % 6]::timestamptz;
  UPDATE trips SET trip_id = 9223372036854775807 - trip_id WHERE trip_id < 150;
  UPDATE riders SET joined = (ARRAY['infinity','-infinity','4713-01-01 BC','5874897-12-31',NULL,'2025-06-01'])[1 + rider_id % 6]::date, nick = repeat('İ\\', 60000)`

test('whether a statement fails does not hang on any row', async () => {
  const plain = []
  for (const sql of statements) plain.push([sql, codeOf(await outcomeOf(ana, sql))])
  await vault.query(worst)
  const odd = []
  for (const sql of statements) odd.push([sql, codeOf(await outcomeOf(ana, sql))])
  expect(odd).toEqual(plain)
  expect(plain.filter(([, code]) => code === '58000')).toEqual([])
}, 60_000)

function codeOf(outcome: Awaited<ReturnType<typeof outcomeOf>>): string {
  return 'code' in outcome ? outcome.code : 'answered'
}

test('no error text of the vault reaches the client or the log', async () => {
  const bob = await server.connect('bob')
  const before = server.logged.length
  await vault.query('ALTER TABLE trips RENAME COLUMN exact TO secret_column')
  const gone = await outcomeOf(bob, 'SELECT sum(exact) FROM trips')
  await vault.query('ALTER TABLE trips RENAME COLUMN secret_column TO exact')
  await vault.query(`CREATE FUNCTION raise_secret() RETURNS boolean LANGUAGE plpgsql AS $$ BEGIN RAISE EXCEPTION 'rider seven owes us 40 pence'; END $$;
    ALTER TABLE trips RENAME TO trips_kept; CREATE VIEW trips AS SELECT * FROM trips_kept WHERE raise_secret()`)
  const raised = await outcomeOf(bob, 'SELECT count(*) FROM trips')
  await vault.query('DROP VIEW trips; ALTER TABLE trips_kept RENAME TO trips')
  for (const outcome of [gone, raised])
    expect(outcome).toMatchObject({ code: '58000', message: 'the answer could not be made; what was debited stands [release.failed]' })
  const logged = JSON.stringify(server.logged.slice(before))
  for (const word of ['secret', 'rider seven', 'owes', 'does not exist', 'exact', 'SELECT'])
    expect(`${JSON.stringify([gone, raised])} ${logged}`).not.toContain(word)
  expect(await outcomeOf(bob, 'SELECT count(*) FROM trips')).toHaveProperty('rows')
})
