import { afterAll, describe, expect, test } from 'vitest'
import { Refusal } from '../../src/base/refusal.ts'
import { createParser } from '../../src/sql/parser.ts'
import { planned } from './ferries.ts'

const parser = createParser()
afterAll(() => parser.close())

async function codeOf(sql: string): Promise<string> {
  try {
    await planned(parser, sql)
    return 'planned'
  } catch (problem) {
    if (problem instanceof Refusal) {
      expect(problem.message, sql).not.toMatch(/\{\w+\}/)
      expect(problem.hint, sql).not.toMatch(/\{\w+\}/)
      return problem.code
    }
    throw problem
  }
}

const refused: readonly (readonly [code: string, sql: string])[] = [
  ['rows.private', 'SELECT * FROM trips'],
  ['rows.private', 'SELECT fare_pence FROM trips ORDER BY 1 LIMIT 5'],
  ['rows.private', 'SELECT t.* FROM trips t JOIN piers p ON p.pier_id = t.from_pier'],
  ['rows.private', 'TABLE riders'],
  ['rows.private', 'SELECT fare_pence FROM trips UNION ALL SELECT 1'],
  ['rows.private', 'WITH t AS (SELECT * FROM trips) SELECT * FROM t'],
  ['rows.private', 'SELECT t.*, count(*) FROM trips t GROUP BY from_pier'],
  ['rows.person', 'SELECT rider_id, count(*) FROM trips GROUP BY rider_id'],
  ['rows.person', 'SELECT rider_id % 10, count(*) FROM trips GROUP BY 1'],
  ['rows.person', 'SELECT trip_id, count(*) FROM trips GROUP BY 1'],
  ['rows.person', 'SELECT sum(rider_id) FROM trips'],
  ['rows.window', 'SELECT row_number() OVER (ORDER BY fare_pence) FROM trips'],
  ['rows.window', 'SELECT count(*) FROM trips WHERE lag(fare_pence) OVER () > 1'],
  ['rows.locked', 'INSERT INTO trips SELECT 1'],
  ['rows.shadow', 'CREATE TEMP TABLE trips AS SELECT count(*) FROM riders'],
  ['rows.shadow', 'CREATE TEMP VIEW riders AS SELECT count(*) FROM trips'],
  ['block.ungrouped', 'SELECT fare_pence, count(*) FROM trips'],
  ['block.ungrouped', 'SELECT count(*) FROM trips ORDER BY fare_pence'],
  ['block.aggregate', 'SELECT max(fare_pence) FROM trips'],
  ['block.aggregate', 'SELECT count(DISTINCT from_pier) FROM trips'],
  ['block.aggregate', 'SELECT sum(DISTINCT fare_pence) FROM trips'],
  ['block.aggregate', 'SELECT string_agg(note, note) FROM trips'],
  ['block.aggregate', 'SELECT percentile_cont(0.5) WITHIN GROUP (ORDER BY fare_pence) FROM trips'],
  ['block.shape', 'SELECT count(*) FROM (SELECT * FROM trips LIMIT 10) t'],
  ['block.shape', 'SELECT sum(count(*)) FROM trips'],
  ['block.shape', 'SELECT from_pier, count(*) FROM trips GROUP BY ROLLUP (from_pier)'],
  ['block.shape', 'SELECT count(*) FROM trips WHERE fare_pence > (SELECT 1)'],
  ['block.mixed', 'SELECT count(*) FROM trips JOIN (SELECT from_pier, count(*) AS n FROM trips GROUP BY 1) x ON x.from_pier = trips.from_pier'],
  ['block.mixed', 'SELECT count(*) FROM trips JOIN elsewhere ON true'],
  ['block.mixed', "SELECT count(*) FROM trips, regexp_split_to_table('a b', ' ') AS w"],
  ['block.correlated', 'SELECT p.name, (SELECT count(*) FROM trips t WHERE t.from_pier = p.pier_id) FROM piers p'],
  ['join.person', 'SELECT count(*) FROM riders JOIN trips ON riders.birth_year = trips.fare_pence'],
  ['join.person', 'SELECT count(*) FROM riders, trips'],
  ['join.person', 'SELECT count(*) FROM trips a JOIN trips b ON a.trip_id < b.trip_id'],
  ['join.person', 'SELECT count(*) FROM riders r LEFT JOIN trips t ON t.from_pier = r.birth_year'],
  ['join.outer', 'SELECT count(*) FROM riders FULL JOIN trips USING (rider_id)'],
  ['join.padding', 'SELECT p.name, count(*) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY 1'],
  ['join.padding', 'SELECT p.name, count(p.zone) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY 1'],
  ['join.padding', 'SELECT p.name, sum(CASE WHEN t.fare_pence IS NULL THEN 1 ELSE 0 END) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY 1'],
  ['join.fan-out', 'SELECT count(*) FROM trips, tides a, tides b, tides c'],
  ['join.fan-out', 'SELECT count(*) FROM complaints a JOIN trips t USING (trip_id) JOIN trips u ON u.rider_id = t.rider_id'],
  ['expr.function', 'SELECT count(*) FROM trips WHERE sin(fare_pence) > 0'],
  ['expr.function', "SELECT count(*) FROM trips WHERE pg_read_file('x') IS NULL"],
  ['expr.function', 'SELECT count(*) FROM trips WHERE random() < 0.5'],
  ['expr.unsupported', "SELECT count(*) FROM trips WHERE note ~ '(a+)+'"],
  ['expr.unsupported', 'SELECT count(*) FROM trips WHERE note LIKE note'],
  ['expr.unsupported', "SELECT count(*) FROM trips WHERE note LIKE 'x\\'"],
  ['expr.unsupported', 'SELECT count(*) FROM trips WHERE note::integer > 1'],
  ['expr.unsupported', "SELECT count(*) FROM riders WHERE profile ->> 'a' = 'b'"],
  ['expr.unsupported', 'SELECT count(*) FROM trips WHERE left(note, fare_pence) = note'],
  ['expr.unbounded', 'SELECT count(*) FROM trips WHERE weight * 2 > 1'],
  ['expr.unbounded', 'SELECT count(*) FROM trips WHERE weight::integer > 1'],
  ['expr.unbounded', 'SELECT count(*) FROM trips WHERE 1 / weight > 0'],
  ['expr.clamp', 'SELECT sum(weight) FROM trips'],
  ['expr.clamp', 'SELECT sum(big) FROM trips'],
  ['keys.form', 'SELECT rested, count(*) FROM trips GROUP BY 1'],
  ['keys.form', 'SELECT nickname, count(*) FROM riders GROUP BY 1'],
  ['keys.form', 'SELECT profile, count(*) FROM riders GROUP BY 1'],
]

describe('a statement that would show or unbound a person', () => {
  test.each(refused)('is refused with %s: %s', async (code, sql) => {
    expect(await codeOf(sql)).toBe(code)
  })
})

const answered: readonly string[] = [
  'SELECT count(*) FROM trips',
  'SELECT count(profile) FROM riders WHERE profile IS NOT NULL',
  'SELECT p.name, count(t.trip_id), sum(t.fare_pence) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY p.pier_id',
  'SELECT p.name, sum(CASE WHEN t.fare_pence > 5 THEN 1 ELSE 0 END) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY 1',
  'SELECT count(*) FROM riders r LEFT JOIN trips t USING (rider_id) WHERE t.trip_id IS NULL',
  'SELECT count(*) FROM complaints c JOIN trips t ON t.trip_id = c.trip_id JOIN riders r ON r.rider_id = t.rider_id',
  'SELECT count(*) FROM trips a JOIN trips b USING (rider_id)',
  'SELECT sum(fare_pence * 2 - 1), sum(delay_min), avg(fare_pence / 2) FROM trips',
  'SELECT fare_pence + 1, count(*) FROM trips WHERE big - 2 > 1 GROUP BY 1 HAVING count(*) > 5',
  'SELECT count(*) FROM (SELECT DISTINCT fare_pence FROM trips) t',
  'SELECT count(*) FROM trips WHERE big + big > 1',
  "SELECT count(*) FROM trips WHERE boarded_at > now() - interval '30 days'",
  'WITH t AS (SELECT fare_pence AS f FROM trips WHERE fare_pence > 3) SELECT sum(f) FROM t',
  'SELECT (SELECT count(*) FROM trips)::numeric / (SELECT count(*) FROM riders)',
  'SELECT DISTINCT district FROM riders',
  'SELECT count(*) FROM riders LEFT JOIN trips USING (rider_id) LEFT JOIN complaints USING (trip_id)',
]

describe('a statement whose bound is proved', () => {
  test.each(answered)('is planned: %s', async (sql) => {
    expect(await codeOf(sql)).toBe('planned')
  })
})
