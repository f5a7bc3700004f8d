import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { ferries, ferryPolicy } from '../clients/ferries.ts'
import type { TestHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow
let client: pg.Client
beforeAll(async () => {
  server = await ferries({
    policy: ferryPolicy.replace('defaults: { epsilon: 1e30, delta: 1e-8 }', 'defaults: { epsilon: 0.5, delta: 1e-8 }'),
    analysts: { ana: '{ epsilon: 500, delta: 1e-3, renews: never }', ben: '{ epsilon: 500, delta: 1e-3, renews: never }' },
    everyone: '{ epsilon: 1000, delta: 1e-2 }',
  })
  // one Gaussian release closes the epsilon track, in which these tests count: ana's noise is Laplace throughout
  client = await server.connect('ana', laplace)
})
afterAll(() => server.stop())

const count = 'SELECT count(*) FROM riders'
const laplace = { options: '-c hedgerow.noise=laplace' }

async function last(of: pg.Client = client): Promise<Readonly<Record<string, string>>> {
  return (await of.query('SELECT * FROM hedgerow.last_answer')).rows[0] as Readonly<Record<string, string>>
}

async function charges(): Promise<number> {
  return Number((await client.query('SELECT count(*) FROM hedgerow.charges')).rows[0].count)
}

describe('a bad value is refused with 22023 and what it takes, and nothing is debited', () => {
  const bad: readonly (readonly [name: string, value: string])[] = [
    ['epsilon', '0'],
    ['epsilon', '-1'],
    ['epsilon', 'plenty'],
    ['epsilon', 'NaN'],
    ['epsilon', 'Infinity'],
    ['epsilon', '1e999999999'],
    ['epsilon', '0x10'],
    ['delta', '1'],
    ['delta', '-1e-9'],
    ['delta', 'none'],
    ['confidence', '1'],
    ['confidence', '95%'],
    ['noise', 'loud'],
    ['groups', '0'],
    ['groups', '1.5'],
    ['groups', '-3'],
    ['rows', 'all'],
    ['rows', '10000000000'],
    ['nonnegative', 'perhaps'],
    ['margin', '25'],
    ['replay', 'on'],
  ]
  test.each(bad)('hedgerow.%s = %s', async (name, value) => {
    const before = await charges()
    await client.query(`SET hedgerow.${name} = '${value}'`)
    try {
      const refused = (await client.query(count).catch((problem: unknown) => problem)) as pg.DatabaseError
      expect(refused).toMatchObject({ code: '22023', message: `invalid value for hedgerow.${name}: "${value}" [setting.bad]` })
      expect(refused.hint).toMatch(/^It takes .+, for example SET hedgerow\.\w+ = \S+$/)
    } finally {
      await client.query(`RESET hedgerow.${name}`)
    }
    expect(await charges()).toBe(before)
  })
})

test('RESET gives the policy’s value back', async () => {
  await client.query('SET hedgerow.epsilon = 0.25')
  await client.query(count)
  expect(await last()).toMatchObject({ epsilon: '0.25' })
  await client.query('RESET hedgerow.epsilon')
  await client.query(count)
  expect(await last()).toMatchObject({ epsilon: '0.5' })
  await client.query('SET hedgerow.epsilon = 0.25')
  await client.query('RESET ALL')
  await client.query(count)
  expect(await last()).toMatchObject({ epsilon: '0.5' })
})

test('SET LOCAL is undone at the end of its transaction, and a rollback undoes SET', async () => {
  await client.query('BEGIN')
  await client.query('SET LOCAL hedgerow.epsilon = 0.125')
  await client.query(count)
  expect(await last()).toMatchObject({ epsilon: '0.125' })
  await client.query('COMMIT')
  await client.query(count)
  expect(await last()).toMatchObject({ epsilon: '0.5' })
  await client.query('BEGIN')
  await client.query('SET hedgerow.epsilon = 0.125')
  await client.query('ROLLBACK')
  await client.query(count)
  expect(await last()).toMatchObject({ epsilon: '0.5' })
})

test('a setting comes with the start-up options, and SHOW shows it', async () => {
  const each = await server.connect('ben', { options: '-c hedgerow.epsilon=0.0625 -c hedgerow.noise=gaussian' })
  expect((await each.query('SHOW hedgerow.epsilon')).rows).toEqual([{ 'hedgerow.epsilon': '0.0625' }])
  await each.query(count)
  expect(await last(each)).toMatchObject({ mechanism: 'gaussian' })
})

test('noise as set is the noise used; tighter bounds lower the scale and looser ones change nothing', async () => {
  const each = await server.connect('ana', laplace)
  const scaleOf = async (setting: string): Promise<Readonly<Record<string, string>>> => {
    await each.query(setting)
    await each.query('SELECT count(*) FROM trips')
    return last(each)
  }
  expect(await scaleOf("SET hedgerow.noise = 'laplace'")).toMatchObject({ mechanism: 'laplace', rows_per_group: '100', scale: '200' })
  expect(await scaleOf('SET hedgerow.rows = 10')).toMatchObject({ rows_per_group: '10', scale: '20' })
  expect(await scaleOf('SET hedgerow.rows = 5000')).toMatchObject({ rows_per_group: '100', scale: '200' })
})

test('a wider confidence gives a wider margin, and nonnegative lifts a negative count to zero', async () => {
  const each = await server.connect('ana', laplace)
  const marginOf = async (confidence: string): Promise<number> => {
    await each.query(`SET hedgerow.confidence = ${confidence}`)
    await each.query(count)
    return Number((await last(each))['margin'])
  }
  expect(await marginOf('0.5')).toBeLessThan(await marginOf('0.999'))
  await each.query('SET hedgerow.nonnegative = on; SET hedgerow.epsilon = 0.01')
  for (let i = 0; i < 12; i += 1) {
    const { rows } = await each.query('SELECT count(*) FROM riders WHERE birth_year > 2015')
    expect(Number(rows[0].count)).toBeGreaterThanOrEqual(0)
  }
})

test('SHOW and current_setting know every setting before it was set', async () => {
  const each = await server.connect('ana', laplace)
  for (const name of ['epsilon', 'delta', 'margin', 'confidence', 'noise', 'groups', 'rows', 'replay', 'nonnegative']) {
    expect((await each.query(`SHOW hedgerow.${name}`)).rows).toHaveLength(1)
  }
})
