import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { hostileWorld, outcomeOf } from './world.ts'

let server: TestHedgerow
let ana: pg.Client
let bob: pg.Client

beforeAll(async () => {
  server = await hostileWorld()
  ana = await server.connect('ana')
  bob = await server.connect('bob')
  await ana.query('SELECT count(*) FROM trips')
  await bob.query('SELECT sum(fare) FROM trips')
})
afterAll(() => server.stop())

async function rowsOf(client: pg.Client, sql: string): Promise<readonly (readonly (string | null)[])[]> {
  const outcome = await outcomeOf(client, sql)
  if ('code' in outcome) throw new Error(`${sql}: ${outcome.message}`)
  return outcome.rows
}

async function charges(client: pg.Client): Promise<number> {
  return (await rowsOf(client, 'SELECT id FROM hedgerow.charges')).length
}

test('a cheap function that looks over a view’s shoulder sees the reader’s own rows and nothing else', async () => {
  const seen: string[] = []
  bob.on('notice', (notice) => seen.push(notice.message ?? ''))
  await bob.query(
    `CREATE FUNCTION pg_temp.peek(anything text) RETURNS boolean LANGUAGE plpgsql COST 0.0000001 AS $$ BEGIN RAISE NOTICE 'peeked %', anything; RETURN true; END $$`,
  )
  for (const view of ['budget', 'charges', 'last_answer']) {
    const own = (await rowsOf(bob, `SELECT v::text FROM hedgerow.${view} v`)).flat()
    seen.length = 0
    await bob.query(`SELECT count(*) FROM hedgerow.${view} v WHERE pg_temp.peek(v::text)`)
    expect(own.length).toBeGreaterThan(0)
    expect(new Set(seen.map((text) => text.replace('peeked ', '')))).toEqual(new Set(own))
  }
  const anas = (await rowsOf(ana, 'SELECT id FROM hedgerow.charges')).flat()
  for (const id of anas) expect(JSON.stringify(seen)).not.toContain(id)
})

test('the last answer is the session’s own: another session of anyone has none', async () => {
  expect(await rowsOf(ana, 'SELECT output FROM hedgerow.last_answer')).toEqual([['count(*)']])
  expect(await rowsOf(await server.connect('ana'), 'SELECT output FROM hedgerow.last_answer')).toEqual([])
  expect(await rowsOf(bob, 'SELECT output FROM hedgerow.last_answer')).toEqual([['sum(fare)']])
})

test('pull called by hand is planned and debited like any statement, whatever siblings it names', async () => {
  for (const call of [
    `hedgerow.pull('SELECT count(*) FROM trips', '[]')`,
    `hedgerow.pull('SELECT count(*) FROM trips', '[]', '["x", "x", "x"]')`,
    `hedgerow.pull('SELECT count(*) FROM trips', '[]', '["SELECT count(*) FROM trips", "SELECT count(*) FROM trips"]')`,
    `hedgerow.pull('SELECT count(*) FROM trips', '[]', (SELECT jsonb_agg('SELECT count(*) FROM trips'::text) FROM generate_series(1, 5000)), ARRAY['nothing'])`,
  ]) {
    const before = await charges(ana)
    expect(await rowsOf(ana, `SELECT ${call}`)).toEqual([['[{"count": "308"}]']])
    expect(await charges(ana)).toBe(before + 1)
    const [[epsilon, rho] = []] = await rowsOf(ana, 'SELECT epsilon, rho FROM hedgerow.charges LIMIT 1')
    expect(Number(epsilon ?? rho)).toBeGreaterThan(0)
  }
})

test('a share of a statement’s epsilon costs what its noise is worth', async () => {
  await ana.query(`SET hedgerow.epsilon = '0.5'`)
  const siblings = `(SELECT jsonb_agg('SELECT count(*) FROM trips'::text) FROM generate_series(1, 5))`
  await rowsOf(ana, `SELECT hedgerow.pull('SELECT count(*) FROM trips', '[]', ${siblings})`)
  const [[charged] = []] = await rowsOf(ana, 'SELECT coalesce(epsilon, rho) FROM hedgerow.charges LIMIT 1')
  const [[scale, mechanism] = []] = await rowsOf(ana, 'SELECT scale, mechanism FROM hedgerow.last_answer')
  await ana.query('RESET hedgerow.epsilon')
  const [n = 0, d = 1] = (scale ?? '').split('/').map(Number)
  // the count's sensitivity is 20 rows: epsilon = 20 / scale, rho = 20² / 2 variance
  const worth = mechanism === 'laplace' ? 20 / (n / d) : 400 / (2 * (n / d))
  expect(Number(charged)).toBeCloseTo(worth, 9)
  expect(Number(charged)).toBeLessThanOrEqual(0.1)
})

test('what an analyst aborts, rolls back or gives up half-way stays debited', async () => {
  const before = await charges(ana)
  await ana.query('BEGIN')
  await ana.query('SELECT count(*) FROM trips')
  await ana.query('ROLLBACK')
  await outcomeOf(ana, 'SELECT 1 / (count(*) - 308) FROM trips')
  await ana.query('BEGIN')
  await ana.query('SAVEPOINT s')
  await ana.query('SELECT count(*) FROM trips')
  await ana.query('ROLLBACK TO s')
  await ana.query('COMMIT')
  expect(await charges(ana)).toBe(before + 3)
})

test('nothing of Hedgerow’s own in the lobby is open to an analyst', async () => {
  for (const sql of [
    `SELECT hedgerow_inside.ask('release', 'x', '[]', '[]')`,
    `SELECT hedgerow_inside.dblink_connect('x', 'hedgerow_pull')`,
    `SELECT * FROM hedgerow_inside.made`,
    `SELECT hedgerow.read('release')`,
    `SET ROLE hedgerow_owner`,
    `SET SESSION AUTHORIZATION ana`,
    `CREATE OR REPLACE FUNCTION hedgerow.pull(block text, args jsonb, siblings jsonb DEFAULT '[]', names text[] DEFAULT '{}') RETURNS jsonb LANGUAGE sql AS 'SELECT NULL::jsonb'`,
    `CREATE FUNCTION public.lower(text) RETURNS text LANGUAGE sql AS 'SELECT $1'`,
    `CREATE OPERATOR public.= (LEFTARG = int, RIGHTARG = text, FUNCTION = pg_catalog.int4eq)`,
    `CREATE POLICY x ON public.trips USING (true)`,
    `ALTER TABLE public.trips DISABLE ROW LEVEL SECURITY`,
    `COPY (SELECT 1) TO '/tmp/x'`,
    `SELECT pg_read_file('/etc/passwd')`,
    `SELECT lo_create(0)`,
    `SELECT pg_advisory_lock(1)`,
    `SELECT umoptions FROM pg_user_mapping`,
  ])
    expect([sql, 'code' in (await outcomeOf(bob, sql))]).toEqual([sql, true])
  expect((await rowsOf(bob, `SELECT coalesce(array_to_string(umoptions, ','), '') FROM pg_user_mappings`)).flat()).toEqual([''])
})

test('a shell that gets past the gate raises and is never an empty answer', async () => {
  await bob.query('SET row_security = on')
  for (const sql of [
    `SELECT count(*) FROM U&"tr\\0069ps"`,
    `DO $$ DECLARE n int; BEGIN EXECUTE 'SELECT count(*) FROM tri' || 'ps' INTO n; RAISE NOTICE 'rows %', n; END $$`,
    `SELECT query_to_xml('SELECT * FROM tri' || 'ps', true, true, '')`,
    `SELECT (xpath('/', table_to_xml('public.trips'::regclass, true, true, '')))`,
    `CREATE TEMP VIEW v AS SELECT * FROM U&"tr\\0069ps"; SELECT * FROM v`,
  ])
    expect(await outcomeOf(bob, sql)).toMatchObject({ code: '42501' })
  await bob.query('RESET row_security')
})
