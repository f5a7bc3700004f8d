import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { loadFerries } from '../../src/demo/load-ferries.ts'
import { piers } from '../../src/demo/schema.ts'
import { demoStatements } from '../../src/demo/statements.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'

let server: TestServer
let ferries: pg.Client
const told: { readonly fraction: number; readonly doing: string }[] = []

beforeAll(async () => {
  server = await testServer()
  const url = await server.createDatabase('ferries')
  await loadFerries(url, (fraction, doing) => told.push({ fraction, doing }))
  ferries = new pg.Client({ connectionString: url })
  await ferries.connect()
}, 60_000)

afterAll(async () => {
  await ferries.end()
  await server.stop()
})

async function row(sql: string, client = ferries): Promise<Record<string, unknown>> {
  return (await client.query(sql)).rows[0] as Record<string, unknown>
}

describe('the ferry company', () => {
  test('has at least 20,000 riders and 500,000 trips', async () => {
    const { riders, trips } = await row('SELECT (SELECT count(*)::integer FROM riders) AS riders, (SELECT count(*)::integer FROM trips) AS trips')
    expect(riders).toBeGreaterThanOrEqual(20_000)
    expect(trips).toBeGreaterThanOrEqual(500_000)
  })

  test('has a few riders with thousands of trips and many with a handful', async () => {
    const { heavy, median, most } = await row(`
      SELECT count(*) FILTER (WHERE n >= 2000)::integer AS heavy, percentile_disc(0.5) WITHIN GROUP (ORDER BY n)::integer AS median, max(n)::integer AS most
      FROM (SELECT count(*) AS n FROM trips GROUP BY rider_id) AS tally`)
    expect(heavy).toBeGreaterThanOrEqual(3)
    expect(heavy).toBeLessThan(100)
    expect(median).toBeLessThan(20)
    expect(most).toBeGreaterThan(4_000)
  })

  test('keeps every value within what a policy can declare about it', async () => {
    const { outside } = await row(`
      SELECT count(*)::integer AS outside FROM trips JOIN riders USING (rider_id)
      WHERE fare_pence NOT BETWEEN 0 AND 2500 OR delay_min < 0 OR delay_min % 0.5 <> 0 OR birth_year NOT BETWEEN 1920 AND 2020
        OR boarded_at < '2025-01-01 00:00+00' OR boarded_at >= '2026-12-31 00:00+00' OR from_pier = to_pier OR boarded_at::date < joined`)
    expect(outside).toBe(0)
  })

  test('leaves some birth years and delays unknown', async () => {
    const { years, delays } = await row(`
      SELECT (SELECT count(*)::integer FROM riders WHERE birth_year IS NULL) AS years, (SELECT count(*)::integer FROM trips WHERE delay_min IS NULL) AS delays`)
    expect(years).toBeGreaterThan(100)
    expect(delays).toBeGreaterThan(1_000)
  })

  test('has a pier that no trip starts from, and no other such pier', async () => {
    const { rows } = await ferries.query('SELECT name FROM piers WHERE NOT EXISTS (SELECT FROM trips WHERE from_pier = pier_id)')
    expect(rows).toEqual([{ name: piers.at(-1)?.name }])
  })

  test('has topics that hundreds of riders complain about and topics that hardly anybody does', async () => {
    const { rows } = await ferries.query<{ riders: number }>(
      'SELECT count(DISTINCT rider_id)::integer AS riders FROM complaints JOIN trips USING (trip_id) GROUP BY topic ORDER BY riders',
    )
    expect(rows.at(0)?.riders).toBeLessThan(60)
    expect(rows.at(-1)?.riders).toBeGreaterThan(2_000)
  })

  test('ties its tables together with valid keys', async () => {
    const { rows } = await ferries.query(
      "SELECT conrelid::regclass::text AS relation, contype::text AS kind, count(*)::integer AS n FROM pg_constraint WHERE contype IN ('p', 'f') AND convalidated AND connamespace = 'public'::regnamespace GROUP BY 1, 2 ORDER BY 1, 2",
    )
    expect(rows).toEqual([
      { relation: 'complaints', kind: 'f', n: 1 },
      { relation: 'complaints', kind: 'p', n: 1 },
      { relation: 'piers', kind: 'p', n: 1 },
      { relation: 'riders', kind: 'p', n: 1 },
      { relation: 'trips', kind: 'f', n: 3 },
      { relation: 'trips', kind: 'p', n: 1 },
    ])
  })

  test('is told about while it loads, from nothing to all, never backwards', () => {
    const fractions = told.map(({ fraction }) => fraction)
    expect(fractions.length).toBeGreaterThan(20)
    expect(fractions).toEqual(fractions.toSorted((a, b) => a - b))
    expect([fractions.at(0), fractions.at(-1)]).toEqual([0, 1])
  })

  test('comes out the same each time, also in a smaller company', async () => {
    const digest =
      "SELECT md5(string_agg(t::text, ',' ORDER BY trip_id)) AS trips, (SELECT md5(string_agg(r::text, ',' ORDER BY rider_id)) FROM riders r) AS riders FROM trips t"
    const digests = await Promise.all(
      [1, 2].map(async () => {
        const url = await server.createDatabase('ferries_small')
        await loadFerries(url, undefined, 300)
        const client = new pg.Client({ connectionString: url })
        await client.connect()
        try {
          await client.query("SET TimeZone = 'UTC'")
          return await row(digest, client)
        } finally {
          await client.end()
        }
      }),
    )
    expect(digests[0]).toEqual(digests[1])
    expect(digests[0]?.['trips']).toMatch(/^[0-9a-f]{32}$/)
  })
})

describe('the statements of the demo', () => {
  test('all run on the tables themselves', async () => {
    for (const { sql } of demoStatements) await expect(ferries.query(sql), sql).resolves.toBeDefined()
  })

  test('number at least six, one of them refused', () => {
    expect(demoStatements.length).toBeGreaterThanOrEqual(6)
    expect(demoStatements.filter(({ outcome }) => outcome === 'refused')).toHaveLength(1)
  })
})
