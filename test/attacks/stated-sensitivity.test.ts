import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
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

/** What EXPLAIN states: the sensitivity in units of a group, and the groups a person can touch. */
async function stated(sql: string): Promise<{ readonly each: number; readonly groups: number } | null> {
  const plan = await outcomeOf(ana, `EXPLAIN ${sql}`)
  if ('code' in plan) return null
  const [, each = '', groups = ''] = /sensitivity (\d+) in each of (\d+) groups/.exec(plan.rows.flat().join('\n')) ?? []
  return { each: Number(each), groups: Number(groups) }
}

/** Answers without noise on all the rows, and without one rider's. */
async function withAndWithout(sql: string, rider: string): Promise<readonly [Map<string, number>, Map<string, number>]> {
  const read = async (): Promise<Map<string, number>> => {
    const answer = await outcomeOf(ana, sql)
    if ('code' in answer) throw new Error(`${sql}: ${answer.message}`)
    return new Map(answer.rows.map((row) => [JSON.stringify(row.slice(0, -1)), Number(row.at(-1) ?? '0')]))
  }
  const before = await read()
  await vault.query(
    `CREATE TABLE kept_r AS SELECT * FROM riders WHERE rider_id = ${rider}; CREATE TABLE kept_t AS SELECT * FROM trips WHERE rider_id = ${rider}; DELETE FROM trips WHERE rider_id = ${rider}; DELETE FROM riders WHERE rider_id = ${rider}`,
  )
  try {
    return [before, await read()]
  } finally {
    await vault.query('INSERT INTO riders SELECT * FROM kept_r; INSERT INTO trips SELECT * FROM kept_t; DROP TABLE kept_r, kept_t')
  }
}

/** Each statement either is refused, or one rider moves it by no more than EXPLAIN says. `unit`: the step of the sum. */
const statements: [what: string, sql: string, rider: string, unit?: number][] = [
  [
    'a float between two person keys does not make them one person',
    `SELECT count(*) FROM trips a JOIN (VALUES (1, '9007199254740992'::float8)) v(n, f) ON a.rider_id = v.f JOIN trips b ON b.rider_id = v.f`,
    '9007199254740992',
  ],
  [
    'a column of the padded side of a LEFT JOIN is a second group',
    'SELECT r.district, count(t.trip_id) FROM trips t LEFT JOIN riders r ON r.rider_id = t.rider_id AND t.fare > 5 GROUP BY r.district',
    '7',
  ],
  [
    'several padded sides are many groups',
    'SELECT a.district, b.district AS other, count(t.trip_id) FROM trips t LEFT JOIN riders a ON a.rider_id = t.rider_id AND t.fare > 5 LEFT JOIN riders b ON b.rider_id = t.rider_id AND t.pier = 1 GROUP BY 1, 2',
    '7',
  ],
  ['the days to a far date are no fewer than they are', `SELECT sum(DATE '5874897-12-31' - joined) FROM riders`, '7'],
  ['the year of a date moved far away is no less than it is', 'SELECT sum(extract(year FROM joined + 1000000000)) FROM riders', '7'],
  ['a quotient that rounds up to a half is within its range', 'SELECT sum((fare / 20.0000000000000000000000001)::int * 1000000) FROM trips', '7'],
  ['an integer between the steps of its policy divides by what it is', 'SELECT sum(1000 / bundle) FROM trips', '7'],
  ['a float clamp holds for what the float prints as', 'SELECT sum(weight) FROM trips', '9007199254740993'],
  ['a count over a self-join is bounded', 'SELECT count(*) FROM trips a JOIN trips b USING (rider_id)', '7'],
]

describe('no statement moves by more than EXPLAIN says', () => {
  beforeAll(() =>
    vault.query(
      'UPDATE trips SET fare = 10 WHERE rider_id = 7; UPDATE trips SET fare = 1 WHERE rider_id = 7 AND pier = 2; UPDATE trips SET bundle = 1 WHERE rider_id = 7; UPDATE trips SET weight = 1234567 WHERE rider_id = 9007199254740993; UPDATE trips SET fare = 3 WHERE rider_id = 7 AND trip_id % 2 = 0',
    ),
  )
  test.each(statements)('%s', async (_: string, sql: string, rider: string, unit = 1) => {
    const bound = await stated(sql)
    if (bound === null) return expect(await outcomeOf(ana, sql)).toHaveProperty('code')
    const [all, less] = await withAndWithout(sql, rider)
    const moves = [...new Set([...all.keys(), ...less.keys()])].map((key) => Math.abs((all.get(key) ?? 0) - (less.get(key) ?? 0)) / unit)
    expect({ sql, groups: moves.filter((move) => move > 0).length, most: Math.max(...moves) }).toSatisfy(
      ({ groups, most }: { groups: number; most: number }) => groups <= bound.groups && most <= bound.each,
      `at most ${JSON.stringify(bound)}`,
    )
  })
})
