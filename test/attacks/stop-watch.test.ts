import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { hostilePolicy, hostileWorld, outcomeOf } from './world.ts'

/** One rider with 60,000 trips, the others with ten each: what the stop-watch would tell apart. */
const heavy = `;
  INSERT INTO riders VALUES (77, 'a', DATE '2021-01-01', 'h', 'h');
  INSERT INTO trips SELECT 100000 + g, 77, 1, g % 10, 1, TIMESTAMPTZ '2025-05-01 00:00+00', 1, 1, 1, 1 FROM generate_series(1, 60000) g;
  CREATE INDEX ON trips (rider_id); ANALYZE`
const classMs = 1000

let server: TestHedgerow
let ana: pg.Client
let bob: pg.Client

beforeAll(async () => {
  server = await hostileWorld({ more: heavy, clock: 'real', policy: hostilePolicy.replace('reply_after: 0.1s', 'reply_after: 1s') })
  ana = await server.connect('ana')
  bob = await server.connect('bob')
  await outcomeOf(ana, 'SELECT count(*) FROM trips')
})
afterAll(() => server.stop())

async function timed(client: pg.Client, sql: string): Promise<{ readonly ms: number; readonly code: string }> {
  const start = performance.now()
  const outcome = await outcomeOf(client, sql)
  return { ms: performance.now() - start, code: 'code' in outcome ? outcome.code : 'answered' }
}

/** How long after its debit a reply left, by the one clock of this process. */
async function sinceDebit(client: pg.Client, sql: string): Promise<number> {
  await client.query(sql)
  const left = Date.now()
  const { rows } = await client.query<{ at: string }>('SELECT released_at AS at FROM hedgerow.last_answer LIMIT 1')
  return left - new Date(rows[0]?.at ?? '').getTime()
}

/** The same statement about a rider with many rows and about one with none. */
function about(sql: string): readonly string[] {
  return ['77', '999999'].map((rider) => sql.replaceAll('$rider', rider))
}

describe('a reply leaves at the instant of its time class, whosever rows it read', () => {
  test.each([
    ['a count', 'SELECT count(*) FROM trips WHERE rider_id = $rider', classMs],
    ['a mean by a declared key', 'SELECT pier, avg(fare) FROM trips WHERE rider_id = $rider GROUP BY pier', classMs],
    ['keys that are selected', 'SELECT fare, count(*) FROM trips WHERE rider_id = $rider GROUP BY fare', classMs],
    ['a self-join', 'SELECT count(*) FROM trips a JOIN trips b USING (rider_id) WHERE rider_id = $rider', 3000],
    [
      'a triple self-join',
      'SELECT count(*) FROM trips a, trips b, trips c WHERE a.rider_id = b.rider_id AND b.rider_id = c.rider_id AND a.rider_id = $rider',
      10_000,
    ],
  ])(
    '%s',
    async (_, sql, instant) => {
      const [present = '', absent = ''] = about(sql)
      for (const ms of await Promise.all([sinceDebit(ana, present), sinceDebit(bob, absent)])) {
        expect(ms).toBeGreaterThanOrEqual(instant - 1)
        expect(ms).toBeLessThan(instant + 900)
      }
    },
    30_000,
  )
})

test('a long series beside people’s rows is refused before anything is asked, alike for everyone', async () => {
  for (const sql of [
    'SELECT count(*) FROM trips CROSS JOIN generate_series(1, 1000000000) WHERE rider_id = $rider',
    'SELECT count(*) FROM trips t JOIN generate_series(1, 1000000000) g ON g = t.fare WHERE t.rider_id = $rider',
    'SELECT count(t.trip_id) FROM generate_series(1, 1000000000) g LEFT JOIN trips t ON g = t.fare WHERE t.rider_id = $rider',
    'SELECT g, count(t.trip_id) FROM generate_series(1, 1000000000) g LEFT JOIN trips t ON g = t.fare AND t.rider_id = $rider GROUP BY g',
  ]) {
    for (const each of about(sql)) {
      const reply = await timed(ana, each)
      expect(reply.code).toBe('42501')
      expect(reply.ms).toBeLessThan(classMs)
    }
  }
})

test('a statement_timeout short of the class ends alike, whether the vault had finished or not, and the debit stands', async () => {
  const hasty = await server.connect('bob')
  await hasty.query(`SET statement_timeout = '700ms'`)
  const spent = async (): Promise<number> => Number((await hasty.query<{ n: string }>('SELECT count(*) AS n FROM hedgerow.charges')).rows[0]?.n)
  const before = await spent()
  for (const rider of ['77', '999999']) {
    const reply = await timed(hasty, `SELECT count(*) FROM trips a JOIN trips b USING (rider_id) WHERE rider_id = ${rider}`)
    expect(reply.code).toBe('57014')
    expect(reply.ms).toBeGreaterThan(600)
    expect(reply.ms).toBeLessThan(2000)
  }
  expect(await spent()).toBe(before + 2)
})

test('a vault that fails is heard of at the instant at which it would have answered', async () => {
  const vault = await server.vault()
  await vault.query('ALTER TABLE trips RENAME COLUMN exact TO hidden')
  const reply = await timed(ana, 'SELECT sum(exact) FROM trips')
  await vault.query('ALTER TABLE trips RENAME COLUMN hidden TO exact')
  expect(reply.code).toBe('58000')
  expect(reply.ms).toBeGreaterThanOrEqual(classMs - 1)
})
