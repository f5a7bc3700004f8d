import { existsSync, statSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { ferryPolicy, ferryVault } from '../clients/ferries.ts'
import { type TestServer, testServer } from '../harness/server.ts'
import { makeProgram, type Program, type Running, writeAnalysts } from './running.ts'

let server: TestServer
let program: Program
let vault: pg.Client
let vaultUrl: string
const modest = ferryPolicy.replace('defaults: { epsilon: 1e30, delta: 1e-8 }', 'defaults: { epsilon: 1, delta: 1e-8 }')

beforeAll(async () => {
  server = await testServer()
  vaultUrl = await server.createDatabase('process_vault')
  vault = new pg.Client(vaultUrl)
  vault.on('error', () => undefined)
  await vault.connect()
  await vault.query(ferryVault)
  program = makeProgram(vaultUrl)
  writeFileSync(join(program.policies, 'ferries.yaml'), modest)
  await writeAnalysts(program.policies, { ana: '{ epsilon: 4.5, delta: 1e-6, renews: never }' }, '{ epsilon: 20, delta: 1e-5 }')
})
afterAll(async () => {
  program.remove()
  await vault.end()
  await server.stop()
})

async function spent(client: pg.Client): Promise<string> {
  return (await client.query("SELECT epsilon_spent::text AS e FROM hedgerow.budget WHERE account <> 'everyone'")).rows[0].e as string
}

async function eventually(fact: () => Promise<boolean>, withinMs = 10_000): Promise<void> {
  const deadline = Date.now() + withinMs
  while (!(await fact())) {
    if (Date.now() > deadline) throw new Error('it did not come about')
    await new Promise((resolve) => setTimeout(resolve, 50))
  }
}

const laplace = "SET hedgerow.noise = 'laplace'"

describe('the program as it is run, on a state of its own', () => {
  let running: Running
  test('starts, says that it is ready, and answers', async () => {
    running = program.run()
    const client = await running.connect('ana', 'ana-key')
    await client.query(laplace)
    expect((await client.query('SELECT count(*) FROM riders')).rows).toHaveLength(1)
    expect(await spent(client)).toBe('1')
    expect(statSync(join(program.state, 'ledger.key')).mode & 0o777).toBe(0o600)
    await client.end()
  }, 60_000)

  test('kill -9 between debit and answer: the debit stands, and the same question is not answered for free', async () => {
    const client = await running.connect('ana', 'ana-key')
    await client.query(laplace)
    await vault.query('BEGIN')
    await vault.query('LOCK TABLE trips IN ACCESS EXCLUSIVE MODE')
    const answer = client.query('SELECT count(*) FROM trips').then(
      () => 'answered',
      () => 'lost',
    )
    const other = new pg.Client(vaultUrl)
    await other.connect()
    await eventually(
      async () =>
        Number((await other.query("SELECT count(*) AS n FROM pg_stat_activity WHERE wait_event_type = 'Lock' AND datname = current_database()")).rows[0].n) ===
        1,
    )
    running.signal('SIGKILL')
    expect(await running.ended).toBe('SIGKILL')
    expect(await answer).toBe('lost')
    await vault.query('ROLLBACK')
    await other.end()
    running = program.run()
    const again = await running.connect('ana', 'ana-key')
    await again.query(laplace)
    expect(await spent(again)).toBe('2')
    await again.query('SELECT count(*) FROM trips')
    expect(await spent(again)).toBe('3')
    expect((await again.query('SELECT count(*) AS n, count(DISTINCT id) AS d FROM hedgerow.charges')).rows).toEqual([{ n: '3', d: '3' }])
    await again.end()
  }, 90_000)

  test('a changed file is taken up by itself: a raised cap counts, what was spent stays', async () => {
    const from = running.lines.length
    await writeAnalysts(
      program.policies,
      { ana: '{ epsilon: 6.5, delta: 1e-6, renews: never }', ben: '{ epsilon: 2, delta: 1e-6, renews: never }' },
      '{ epsilon: 20, delta: 1e-5 }',
    )
    await running.line('policy.in_force', from)
    const client = await running.connect('ben', 'ben-key')
    expect((await client.query('SELECT epsilon_cap::text AS cap FROM hedgerow.budget')).rows).toEqual([{ cap: '2' }, { cap: '20' }])
    await client.end()
    const ana = await running.connect('ana', 'ana-key')
    expect((await ana.query("SELECT epsilon_cap::text AS cap, epsilon_spent::text AS spent FROM hedgerow.budget WHERE account = 'ana'")).rows).toEqual([
      { cap: '6.5', spent: '3' },
    ])
    await ana.end()
  }, 60_000)

  test('a broken file is complained about with its place, and the old policies stay in force', async () => {
    const from = running.lines.length
    writeFileSync(
      join(program.policies, 'ferries.yaml'),
      modest.replace('birth_year: { clamp: [1900, 2020] }', 'birth_yaer: { clamp: [2020, 1900] }\n      nothing: {}'),
    )
    const complaint = await running.line('policy.complaint', from)
    expect(complaint['text']).toMatch(/ferries\.yaml:\d+:\d+: /)
    const client = await running.connect('ana', 'ana-key')
    expect((await client.query('SELECT avg(birth_year) FROM riders LIMIT 0')).fields.map((field) => field.name)).toEqual(['avg'])
    await client.end()
    writeFileSync(join(program.policies, 'ferries.yaml'), modest)
    await running.line('policy.in_force', from)
  }, 60_000)

  test('SIGHUP loads the policies again', async () => {
    // the watcher may still have something to say about the last change
    await new Promise((resolve) => setTimeout(resolve, 1_000))
    const from = running.lines.length
    running.signal('SIGHUP')
    await running.line('policy.in_force', from)
  }, 60_000)

  test('SIGTERM lets a statement under way finish, ends with 0 and stops the server it started', async () => {
    const client = await running.connect('ana', 'ana-key')
    await client.query(laplace)
    const postmaster = join(program.state, 'lobby', 'postgresql', 'data', 'postmaster.pid')
    expect(existsSync(postmaster)).toBe(true)
    const answer = client.query('SELECT count(*), pg_sleep(1) FROM trips')
    await new Promise((resolve) => setTimeout(resolve, 300))
    running.signal('SIGTERM')
    await running.line('serve.stopping')
    expect((await answer).rows).toHaveLength(1)
    expect(await running.ended).toBe(0)
    expect(existsSync(postmaster)).toBe(false)
  }, 60_000)

  test('started again on the same state, what was spent is still spent', async () => {
    running = program.run()
    const client = await running.connect('ana', 'ana-key')
    expect(await spent(client)).toBe('4')
    await client.query(`${laplace}; SET hedgerow.epsilon = 3`)
    await expect(client.query('SELECT count(*) FROM riders')).rejects.toMatchObject({
      code: '42501',
      message: expect.stringContaining('[budget.spent]') as string,
    })
    await client.end()
    running.signal('SIGINT')
    expect(await running.ended).toBe(0)
  }, 60_000)

  test('with policies that do not fit it does not start: exit code 1 and every complaint at its place', async () => {
    writeFileSync(join(program.policies, 'ferries.yaml'), modest.replace('step: 1 }', 'stepp: 1 }').replace('reply_after: 0.1s', 'reply_after: soon'))
    const failed = program.run()
    expect(await failed.ended).toBe(1)
    const complaints = failed.lines.filter((line) => line.event === 'serve.cannot_start').map((line) => String(line['text']))
    for (const complaint of complaints) expect(complaint).toMatch(/ferries\.yaml:\d+:\d+: /)
    expect(complaints).toHaveLength(2)
    expect(complaints.join('\n')).toMatch(/reply_after[^]*stepp/)
  }, 60_000)
})
