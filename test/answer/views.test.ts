import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { ferries, ferryPolicy } from '../clients/ferries.ts'
import type { TestHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow
let ledger: pg.Client
beforeAll(async () => {
  server = await ferries({
    policy: ferryPolicy.replace('defaults: { epsilon: 1e30, delta: 1e-8 }', 'defaults: { epsilon: 0.5, delta: 1e-8 }'),
    analysts: {
      ana: '{ epsilon: 8, delta: 1e-6, renews: never }',
      ben: '{ epsilon: 8, delta: 1e-6, renews: month }',
      cleo: '{ epsilon: 100, delta: 1e-6, renews: never }',
    },
    everyone: '{ epsilon: 10, delta: 1e-5 }',
  })
  ledger = await server.admin('hedgerow_ledger')
})
afterAll(() => server.stop())

type Row = Readonly<Record<string, string | null>>

async function rows(client: pg.Client, text: string): Promise<readonly Row[]> {
  return (await client.query(text)).rows as readonly Row[]
}

async function withNotice(client: pg.Client, text: string): Promise<readonly string[]> {
  const heard: string[] = []
  const hear = (notice: { readonly message?: string | undefined }): void => void heard.push(notice.message ?? '')
  client.on('notice', hear)
  await client.query(text)
  client.off('notice', hear)
  return heard
}

test('the NOTICE, hedgerow.last_answer, hedgerow.charges, hedgerow.budget and the ledger agree to the last digit', async () => {
  const ana = await server.connect('ana', { application_name: 'logbook' })
  await ana.query("SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = 0.75")
  const [notice = ''] = await withNotice(ana, 'SELECT district, count(*), sum(birth_year) FROM riders GROUP BY district')
  const answer = await rows(ana, 'SELECT * FROM hedgerow.last_answer')
  const [charge] = await rows(ana, 'SELECT * FROM hedgerow.charges')
  const [own, all] = await rows(ana, 'SELECT * FROM hedgerow.budget')
  expect(notice).toMatch(/^spent epsilon 0\.75 \(laplace noise\); epsilon 7\.25 or rho /)
  for (const { output, margin } of answer) expect(notice).toContain(`${output} ± ${margin}`)
  expect(answer.map((row) => row['output'])).toEqual(['count(*)', 'sum(birth_year)'])
  for (const row of answer) {
    expect(row).toMatchObject({ mechanism: 'laplace', epsilon: '0.75', delta: '0', confidence: '0.95', groups_per_person: '1', rows_per_group: '1' })
    expect(row['rho']).toBe(charge?.['rho'])
    expect(row['id']).toBe(charge?.['id'])
  }
  expect(charge).toMatchObject({ epsilon: '0.75', delta: '0', mechanism: 'laplace', tables: 'riders', application: 'logbook' })
  expect(own).toMatchObject({ account: 'ana', epsilon_cap: '8', delta_cap: '0.000001', epsilon_spent: '0.75', rho_spent: charge?.['rho'], delta_spent: '0' })
  expect(all).toMatchObject({ account: 'everyone', epsilon_cap: '10', epsilon_spent: '0.75' })
  const tables = (
    await ledger.query(
      "SELECT n.nspname || '.' || c.relname AS name FROM pg_class c JOIN pg_namespace n ON n.oid = c.relnamespace WHERE c.relkind = 'r' AND n.nspname NOT LIKE 'pg_%' AND n.nspname <> 'information_schema'",
    )
  ).rows as { name: string }[]
  const kept: string[] = []
  for (const { name } of tables)
    kept.push(...((await ledger.query(`SELECT to_jsonb(t)::text AS row FROM ${name} t`)).rows as { row: string }[]).map(({ row }) => row))
  expect(kept.some((row) => row.includes(charge?.['id'] ?? 'none'))).toBe(true)
})

test('a statement of two blocks shows all its outputs, and its releases share the epsilon', async () => {
  const ana = await server.connect('ana')
  await ana.query("SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = 0.5")
  await ana.query('SELECT (SELECT count(*) FROM riders) AS r, (SELECT avg(fare) FROM trips) AS f')
  const answer = await rows(ana, 'SELECT output, epsilon FROM hedgerow.last_answer')
  expect(answer.map((row) => row['output'])).toEqual(['count(*)', 'avg(fare)'])
  expect(answer.map((row) => row['epsilon'])).toEqual(['0.25', '0.25'])
})

test('hedgerow.last_answer is the session’s own, and empty before its first answer', async () => {
  const one = await server.connect('ana')
  const two = await server.connect('ana')
  await one.query("SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = 0.01; SELECT count(*) FROM riders")
  expect(await rows(one, 'SELECT output FROM hedgerow.last_answer')).toHaveLength(1)
  expect(await rows(two, 'SELECT output FROM hedgerow.last_answer')).toEqual([])
})

test('hedgerow.bounds says what the policy declares, and each analyst sees only the own account and everyone’s', async () => {
  const ben = await server.connect('ben')
  const bounds = await rows(ben, 'SELECT * FROM hedgerow.bounds')
  const of = (table: string, column: string | null): Row | undefined => bounds.find((row) => row['table_name'] === table && row['column_name'] === column)
  expect(of('trips', null)).toMatchObject({ groups: '10', rows: '100' })
  expect(of('trips', 'weight')).toMatchObject({ clamp_low: '0', clamp_high: '20', step: '0.01' })
  expect(of('riders', 'district')).toMatchObject({ keys: 'Northbank, Eastquay, Saltmarsh, Gullhaven' })
  expect(of('riders', 'secret_note')).toBeUndefined()
  expect(of('piers', null)?.['facts']).toContain('published')
  expect((await rows(ben, 'SELECT account FROM hedgerow.budget')).map((row) => row['account'])).toEqual(['ben', 'everyone'])
  expect(await rows(ben, 'SELECT * FROM hedgerow.charges')).toEqual([])
})

test('a budget that is renewed says that loss adds up', async () => {
  const ben = await server.connect('ben')
  const [own] = await rows(ben, 'SELECT * FROM hedgerow.budget')
  expect(own?.['note']).toContain('loss adds up over the periods')
  expect(own?.['period']).toMatch(/^\d{4}-\d{2}/)
})

test('two blocks that do not fit together are refused at the first, and nothing is debited', async () => {
  const ben = await server.connect('ben')
  const before = await rows(ben, 'SELECT epsilon_spent, rho_spent FROM hedgerow.budget')
  // each half alone would fit the cap of 8; both together do not
  await ben.query("SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = 14")
  const refused = (await ben
    .query('SELECT (SELECT count(*) FROM riders), (SELECT count(*) FROM trips)')
    .catch((problem: unknown) => problem)) as pg.DatabaseError
  expect(refused).toMatchObject({ code: '42501' })
  expect(refused.message).toMatch(/^your budget cannot bear this statement: it asks for epsilon 14, and epsilon 8 or rho /)
  expect(refused.message).toContain('[budget.spent]')
  expect(refused.hint).toContain('SELECT * FROM hedgerow.budget')
  expect(await rows(ben, 'SELECT epsilon_spent, rho_spent FROM hedgerow.budget')).toEqual(before)
})

test('everyone’s cap binds over two analysts, and the refusal says whose budget it is', async () => {
  const cleo = await server.connect('cleo')
  const [, all] = await rows(cleo, 'SELECT * FROM hedgerow.budget')
  const left = 10 - Number(all?.['epsilon_spent'])
  await cleo.query(`SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = ${(left + 1).toFixed(6)}`)
  const refused = (await cleo.query('SELECT count(*) FROM riders').catch((problem: unknown) => problem)) as pg.DatabaseError
  expect(refused).toMatchObject({ code: '42501' })
  expect(refused.message).toMatch(/^everyone's budget cannot bear this statement: it asks for epsilon [\d.]+, and epsilon [\d.]+ or rho /)
  await cleo.query(`SET hedgerow.epsilon = ${(left - 0.5).toFixed(6)}`)
  await cleo.query('SELECT count(*) FROM riders')
  const ana = await server.connect('ana')
  await ana.query("SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = 1")
  await expect(ana.query('SELECT count(*) FROM riders')).rejects.toMatchObject({
    code: '42501',
    message: expect.stringMatching(/^everyone's budget/) as string,
  })
})
