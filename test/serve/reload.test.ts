import { readFile, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { scramVerifier } from '../../src/cli/scram.ts'
import { ferries, ferryPolicy } from '../clients/ferries.ts'
import type { TestHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow
beforeAll(async () => {
  server = await ferries({
    policy: ferryPolicy.replace('defaults: { epsilon: 1e30, delta: 1e-8 }', 'defaults: { epsilon: 0.5, delta: 1e-8 }'),
    analysts: {
      ana: '{ epsilon: 100, delta: 1e-6, renews: never }',
      ben: '{ epsilon: 1, delta: 1e-6, renews: never }',
      cleo: '{ epsilon: 3, delta: 1e-6, renews: never }',
    },
    everyone: '{ epsilon: 200, delta: 1e-5 }',
  })
})
afterAll(() => server.stop())

const analystsFile = (): string => join(server.policies, 'analysts.yaml')
const dataSetFile = (): string => join(server.policies, `${server.dataSet}.yaml`)

async function change(file: string, edit: (text: string) => string): Promise<void> {
  const before = await readFile(file, 'utf8')
  const after = edit(before)
  expect(after).not.toBe(before)
  await writeFile(file, after)
}

function logged(event: string): readonly string[] {
  return server.logged.filter((line) => line.event === event).map((line) => String(line.fields['text'] ?? ''))
}

test('a cap that was lowered or raised is in force at once, in sessions that were open before', async () => {
  const ben = await server.connect('ben')
  await ben.query("SET hedgerow.noise = 'laplace'; SET hedgerow.epsilon = 0.9")
  await ben.query('SELECT count(*) FROM riders')
  await expect(ben.query('SELECT count(*) FROM trips')).rejects.toMatchObject({ message: expect.stringContaining('[budget.spent]') as string })
  await change(analystsFile(), (text) => text.replace('{ epsilon: 1, delta: 1e-6', '{ epsilon: 2, delta: 1e-6'))
  expect(await server.hedgerow.reload()).toBe(true)
  await ben.query('SELECT count(*) FROM trips')
  await change(analystsFile(), (text) => text.replace('{ epsilon: 2, delta: 1e-6', '{ epsilon: 1.5, delta: 1e-6'))
  expect(await server.hedgerow.reload()).toBe(true)
  await expect(ben.query('SELECT sum(fare) FROM trips')).rejects.toMatchObject({ message: expect.stringContaining('[budget.spent]') as string })
  expect((await ben.query('SELECT epsilon_cap, epsilon_spent FROM hedgerow.budget')).rows[0]).toEqual({ epsilon_cap: '1.5', epsilon_spent: '1.8' })
})

test('a new column is there and a removed one is gone, in sessions that were open before', async () => {
  const ana = await server.connect('ana')
  await ana.query({ name: 'kept', text: 'SELECT count(*) FROM riders WHERE birth_year > $1', values: [1960] })
  await expect(ana.query('SELECT count(secret_note) FROM riders')).rejects.toMatchObject({ code: '42703' })
  await change(dataSetFile(), (text) => text.replace('      concession: {}\n', '      secret_note: {}\n'))
  expect(await server.hedgerow.reload()).toBe(true)
  expect((await ana.query('SELECT count(secret_note) FROM riders')).rows).toHaveLength(1)
  await expect(ana.query('SELECT count(*) FROM riders WHERE concession')).rejects.toMatchObject({
    code: '42703',
    message: 'column "concession" does not exist',
  })
  expect((await ana.query({ name: 'kept', text: 'SELECT count(*) FROM riders WHERE birth_year > $1', values: [1960] })).rows).toHaveLength(1)
  const columns = await ana.query("SELECT attname FROM pg_attribute WHERE attrelid = 'riders'::regclass AND attnum > 0 AND NOT attisdropped ORDER BY 1")
  expect(columns.rows.map((row) => (row as { attname: string }).attname)).toEqual(['birth_year', 'district', 'rider_id', 'secret_note'])
})

test('a load is not held up by an analyst’s open transaction and lock: that session is ended, others go on', async () => {
  const holding = await server.connect('ana')
  const bystander = await server.connect('ana')
  await holding.query('BEGIN')
  await holding.query('SELECT * FROM pg_catalog.pg_class WHERE false')
  await holding.query('SELECT count(*) FROM riders LIMIT 0')
  await holding.query('PREPARE p AS SELECT 1 FROM piers')
  await holding.query('SELECT * FROM piers')
  const ended = new Promise<void>((resolve) => holding.once('end', () => resolve()))
  await change(dataSetFile(), (text) => text.replace('      secret_note: {}\n', '      concession: {}\n'))
  const start = Date.now()
  expect(await server.hedgerow.reload()).toBe(true)
  expect(Date.now() - start).toBeLessThan(8_000)
  await ended
  expect((await bystander.query('SELECT count(*) FROM riders WHERE concession')).rows).toHaveLength(1)
})

test('a broken file changes nothing: every complaint is logged with its place, the old policies stay in force', async () => {
  const before = await readFile(dataSetFile(), 'utf8')
  const complaints = logged('policy.complaint').length
  await writeFile(dataSetFile(), before.replace('person: rider_id\n    bounds: { groups: 1, rows: 1 }', 'person: rider_di\n    bounds: { groups: 0, rows: 1 }'))
  await change(analystsFile(), (text) => text.replace('{ epsilon: 100, delta: 1e-6', '{ epsilon: 1, delta: 1e-6'))
  expect(await server.hedgerow.reload()).toBe(false)
  expect(logged('policy.complaint').length).toBeGreaterThan(complaints)
  for (const complaint of logged('policy.complaint')) expect(complaint).toMatch(/\.yaml:\d+:\d+: .+\n\s+\S+/)
  const ana = await server.connect('ana')
  expect((await ana.query('SELECT epsilon_cap FROM hedgerow.budget')).rows[0]).toEqual({ epsilon_cap: '100' })
  await ana.query('SELECT count(*) FROM riders')
  await writeFile(dataSetFile(), before)
  await change(analystsFile(), (text) => text.replace('{ epsilon: 1, delta: 1e-6', '{ epsilon: 100, delta: 1e-6'))
  expect(await server.hedgerow.reload()).toBe(true)
})

test('an analyst’s own password, role settings and memberships are put back at each load', async () => {
  const ana = await server.connect('ana')
  await ana.query("ALTER ROLE ana PASSWORD 'one of my own'")
  await ana.query("ALTER ROLE ana SET statement_timeout = '1h'")
  await ana.query("ALTER ROLE ana SET work_mem = '4GB'")
  await ana.query('ALTER ROLE ana SET row_security = on')
  expect(await server.hedgerow.reload()).toBe(true)
  await expect(
    new pg.Client({ host: '127.0.0.1', port: server.hedgerow.port, user: 'ana', database: server.dataSet, password: 'one of my own' }).connect(),
  ).rejects.toMatchObject({ code: '28P01' })
  const fresh = await server.connect('ana')
  expect((await fresh.query('SHOW row_security')).rows).toEqual([{ row_security: 'off' }])
  expect((await fresh.query('SHOW statement_timeout')).rows).toEqual([{ statement_timeout: '5min' }])
})

test('a new password is asked for from the next load on', async () => {
  const login = await scramVerifier('a new lantern', Buffer.alloc(16, 7))
  const old = await readFile(analystsFile(), 'utf8')
  await change(analystsFile(), (text) => text.replace(/(cleo:\n\s+login: )"[^"]+"/, `$1"${login}"`))
  expect(await server.hedgerow.reload()).toBe(true)
  await expect(new pg.Client(server.url('cleo')).connect()).rejects.toMatchObject({ code: '28P01' })
  const cleo = new pg.Client({ host: '127.0.0.1', port: server.hedgerow.port, user: 'cleo', database: server.dataSet, password: 'a new lantern' })
  await cleo.connect()
  await cleo.end()
  await writeFile(analystsFile(), old)
  expect(await server.hedgerow.reload()).toBe(true)
})

test('an analyst who was removed is gone at once, and looks like a wrong password from then on', async () => {
  const cleo = await server.connect('cleo')
  const ended = new Promise<void>((resolve) => cleo.once('end', () => resolve()))
  await change(analystsFile(), (text) => text.replace(/  cleo:\n.*\n.*\n/, ''))
  expect(await server.hedgerow.reload()).toBe(true)
  await ended
  const again = new pg.Client(server.url('cleo'))
  again.on('error', () => undefined)
  await expect(again.connect()).rejects.toMatchObject({ code: '28P01', message: 'password authentication failed for user "cleo"' })
})

test('statements that run while policies are loaded are answered under one policy or the other, never broken', async () => {
  const clients = await Promise.all([1, 2, 3].map(() => server.connect('ana')))
  let loading = true
  const outcomes: string[] = []
  const asking = clients.map(async (client) => {
    while (loading) {
      await client.query('SELECT district, count(*) FROM riders GROUP BY district').then(
        ({ rows }) => outcomes.push(rows.length.toString()),
        (problem: pg.DatabaseError) => outcomes.push(`${problem.code ?? ''} ${problem.message}`),
      )
    }
  })
  await change(dataSetFile(), (text) => text.replace('[Northbank, Eastquay, Saltmarsh, Gullhaven]', '[Northbank, Eastquay, Saltmarsh]'))
  expect(await server.hedgerow.reload()).toBe(true)
  loading = false
  await Promise.all(asking)
  expect(outcomes.length).toBeGreaterThan(2)
  for (const outcome of outcomes) expect(outcome).toMatch(/^[34]$|^57P01/)
})
