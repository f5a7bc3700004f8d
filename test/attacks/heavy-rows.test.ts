import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { hostileWorld, outcomeOf } from './world.ts'

let server: TestHedgerow
let ana: pg.Client

beforeAll(async () => {
  server = await hostileWorld({ clock: 'real' })
  ana = await server.connect('ana')
})
afterAll(() => server.stop())

/** A text that doubles in each of `levels` derived tables. */
function doubled(levels: number): string {
  let query = '(SELECT rider_id, motto AS x FROM riders) t0'
  for (let i = 1; i <= levels; i++) query = `(SELECT rider_id, x || x AS x FROM ${query}) t${i.toString()}`
  return query
}

test('work that only a row pays for is refused where no time class could hide it', async () => {
  for (const rider of ['7', '777'])
    for (const sql of [
      `SELECT count(*) FROM trips JOIN ${doubled(9)} USING (rider_id) WHERE rider_id = ${rider} AND upper(x) LIKE '%q%w%'`,
      `SELECT count(*) FROM trips WHERE rider_id = ${rider} AND (${Array.from({ length: 20 }, (_, i) => `${Array.from({ length: 50 }, () => 'trip_id').join(' * ')} < ${(-i).toString()}`).join(' OR ')})`,
      `SELECT count(*) FROM trips WHERE rider_id = ${rider} AND (${Array.from({ length: 300 }, () => 'fare::numeric / 7 / 7 > 1').join(' OR ')})`,
    ]) {
      const outcome = await outcomeOf(ana, sql)
      expect(outcome).toMatchObject({ code: '42501', message: 'so much work on each row is not answered over private rows [expr.unsupported]' })
    }
})

test('an expression that is more work than usual puts the statement into a later time class, whether there is a row or not', async () => {
  const expression = Array.from({ length: 30 }, (_, i) => `fare + bundle * 2 < ${(-i).toString()}`).join(' OR ')
  for (const rider of ['7', '777']) {
    await ana.query(`SELECT count(*) FROM trips WHERE rider_id = ${rider} AND (${expression})`)
    const left = Date.now()
    const { rows } = await ana.query<{ at: string }>('SELECT released_at AS at FROM hedgerow.last_answer')
    expect(left - new Date(rows[0]?.at ?? '').getTime()).toBeGreaterThanOrEqual(299)
  }
})
