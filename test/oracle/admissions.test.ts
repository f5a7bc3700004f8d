import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'
import { caseCount } from '../harness/cases.ts'

/**
 * Applicants to the six largest departments of graduate study at Berkeley for the autumn of 1973, by sex and decision: P. J. Bickel, E. A. Hammel and J. W. O'Connell,
 * "Sex Bias in Graduate Admissions: Data from Berkeley", Science 187 (1975), 398–404. The counts are as the statistics literature reproduces them, from memory:
 * department, men admitted, men rejected, women admitted, women rejected.
 */
const published: readonly (readonly [string, number, number, number, number])[] = [
  ['A', 512, 313, 89, 19],
  ['B', 353, 207, 17, 8],
  ['C', 120, 205, 202, 391],
  ['D', 138, 279, 131, 244],
  ['E', 53, 138, 94, 299],
  ['F', 22, 351, 24, 317],
]

const cells = published.flatMap(([department, ...counts]) =>
  counts.map((count, i) => ({ department, sex: i < 2 ? 'men' : 'women', decision: i % 2 === 0 ? 'admitted' : 'rejected', count })),
)
const applicants = cells.reduce((sum, cell) => sum + cell.count, 0)
const question = 'SELECT department, sex, decision, count(*) FROM applicants GROUP BY department, sex, decision'
const releases = caseCount(40)

let server: TestHedgerow

beforeAll(async () => {
  const values = cells.map((cell) => `('${cell.department}', '${cell.sex}', '${cell.decision}', ${cell.count.toString()})`).join(', ')
  server = await testHedgerow({
    vault: `CREATE TABLE applicants (applicant_id int PRIMARY KEY, department text NOT NULL, sex text NOT NULL, decision text NOT NULL);
            INSERT INTO applicants SELECT row_number() OVER (), d, s, a FROM (VALUES ${values}) AS v(d, s, a, n), generate_series(1, n);`,
    policy: `dataset: admissions
schema: public
person: { called: applicant, key: applicants.applicant_id }
defaults: { epsilon: 1, delta: 1e-9 }
reply_after: 0.1s
tables:
  applicants:
    person: applicant_id
    bounds: { groups: 1, rows: 1 }
    columns:
      department: { values: [A, B, C, D, E, F] }
      sex: { values: [men, women] }
      decision: { values: [admitted, rejected] }
`,
    analysts: {
      ana: '{ epsilon: 1e33, delta: 1e-6, renews: never }',
      bea: '{ epsilon: 1e6, delta: 1e-6, renews: never }',
      cy: '{ epsilon: 5, delta: 1e-6, renews: never }',
    },
    everyone: '{ epsilon: 1e34, delta: 1e-5 }',
  })
})
afterAll(() => server.stop())

function exactCount(row: Readonly<Record<string, string>>): number {
  return cells.find((cell) => cell.department === row['department'] && cell.sex === row['sex'] && cell.decision === row['decision'])?.count ?? -1
}

test('the published counts are 24 and add up to 4,526 applicants', () => {
  expect([cells.length, applicants]).toEqual([24, 4526])
})

test('at an epsilon that leaves no noise the 24 published counts come back', async () => {
  const ana = await server.connect('ana')
  await ana.query('SET hedgerow.epsilon = 1e30')
  const { rows } = await ana.query<Record<string, string>>(question)
  expect(rows).toHaveLength(24)
  for (const row of rows) expect(Number(row['count']), JSON.stringify(row)).toBe(exactCount(row))
  const whole = await ana.query<Record<string, string>>(
    "SELECT sex, round(100.0 * count(*) FILTER (WHERE decision = 'admitted') / count(*)) AS admitted, count(*) FROM applicants GROUP BY sex ORDER BY sex",
  )
  expect(whole.rows).toEqual([
    { sex: 'men', admitted: '45', count: '2691' },
    { sex: 'women', admitted: '30', count: '1835' },
  ])
})

/** Errors of fresh releases at epsilon 1 in units of the stated 99 % margin. */
async function errorsOf(client: pg.Client, law: string): Promise<readonly number[]> {
  await client.query(`SET hedgerow.noise = ${law}; SET hedgerow.confidence = 0.99; SET hedgerow.epsilon = 1`)
  const errors: number[] = []
  const ids = new Set<string>()
  for (let i = 0; i < releases; i += 1) {
    const { rows } = await client.query<Record<string, string>>(question)
    const said = await client.query<Record<string, string>>('SELECT id, mechanism, margin FROM hedgerow.last_answer')
    expect(rows).toHaveLength(24)
    expect(said.rows).toHaveLength(1)
    const [only] = said.rows
    if (law !== 'auto') expect(only?.['mechanism']).toBe(law)
    ids.add(only?.['id'] ?? '')
    for (const row of rows) errors.push(Math.abs(Number(row['count']) - exactCount(row)) / Number(only?.['margin']))
  }
  expect(ids.size, 'every release is a fresh one').toBe(releases)
  return errors
}

test.concurrent.each(['auto', 'laplace', 'gaussian'])(
  'by %s noise at epsilon 1 at least 95 in 100 counts lie within their stated margins of confidence 0.99',
  { timeout: 90_000 },
  async (law) => {
    const errors = await errorsOf(await server.connect('bea'), law)
    expect(errors).toHaveLength(24 * releases)
    const within = errors.filter((error) => error <= 1).length
    expect(within / errors.length).toBeGreaterThanOrEqual(0.95)
    expect(errors.filter((error) => error > 0.5).length / errors.length, 'the margin is no wider than the noise calls for').toBeGreaterThan(0.02)
  },
)

test('the margins are those of epsilon 1', async () => {
  const client = await server.connect('cy')
  await client.query('SET hedgerow.noise = laplace; SET hedgerow.confidence = 0.99; SET hedgerow.epsilon = 1')
  await client.query(question)
  const { rows } = await client.query<Record<string, string>>('SELECT scale, margin, epsilon FROM hedgerow.last_answer')
  const [only] = rows
  expect(Fraction.parse(only?.['epsilon'] ?? '0').equals(Fraction.one)).toBe(true)
  // P(|X| > m) = 2 q^(m+1) / (1 + q) with q = 1/e first falls to 0.01 at m = 4 (Ghosh, Roughgarden & Sundararajan 2012)
  expect(only).toMatchObject({ scale: '1', margin: '4' })
})
