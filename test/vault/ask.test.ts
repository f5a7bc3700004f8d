import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import pg from 'pg'
import type { Log } from '../../src/base/ports.ts'
import { BoundedQuery } from '../../src/bound/bounded-query.ts'
import { debitFrom } from '../../src/budget/debit.ts'
import { openExact } from '../../src/release/exact.ts'
import type { ExactRow, ExactTable } from '../../src/release/exact.ts'
import { connectVault } from '../../src/vault/ask.ts'
import type { AskOptions, Vault } from '../../src/vault/ask.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { anyQuery as query } from './any-query.ts'

let server: TestServer
let superuser: string
let watcher: pg.Client
let reader: string
let role: string
let vault: Vault
let logged: unknown[]
const log: Log = (...event) => void logged.push(event)

beforeAll(async () => {
  server = await testServer()
  superuser = await server.createDatabase('vault_ask')
  watcher = new pg.Client({ connectionString: superuser })
  await watcher.connect()
  role = server.uniqueName('vault_reader')
  await sql(`create role ${role} login password 'harbour'`)
  await sql(`create table public.riders (rider_id int primary key, name text, district text); grant select on public.riders to ${role}`)
  await sql(`insert into public.riders select n, 'Rider ' || n, 'Northbank' from generate_series(1, 100) n`)
  const own = new URL(superuser)
  own.username = role
  own.password = 'harbour'
  reader = own.href
}, 60_000)

afterAll(async () => {
  await sql(`drop owned by ${role}; drop role ${role}`)
  await watcher.end()
  await server.stop()
})

beforeEach(async () => {
  logged = []
  vault = await connectVault({ url: reader, statementTimeoutMs: 20_000, maxConnections: 2, log, rowCeiling: 50_000, byteCeiling: 6_000_000 })
})

afterEach(async () => vault.close())

async function sql(text: string): Promise<Record<string, unknown>[]> {
  return (await watcher.query<Record<string, unknown>>(text)).rows
}

function options(more: Partial<AskOptions> = {}): AskOptions {
  return { timeZone: 'UTC', deadlineMs: 10_000, signal: new AbortController().signal, ...more }
}

function rowsOf(table: ExactTable): readonly ExactRow[] {
  return openExact(table, debitFrom({ kind: 'debited', id: 'd', balances: [] })).totals
}

async function running(word: string): Promise<number> {
  const rows = await sql(`select from pg_stat_activity where state = 'active' and query like '%${word}%' and pid <> pg_backend_pid()`)
  return rows.length
}

async function until(held: () => Promise<boolean>, limitMs: number): Promise<number> {
  const start = performance.now()
  while (!(await held())) {
    if (performance.now() - start > limitMs) throw new Error('never came true')
    await new Promise((resolve) => setTimeout(resolve, 5))
  }
  return performance.now() - start
}

describe('asking the vault', () => {
  test('runs nothing that only looks like a bounded query', async () => {
    const lookAlike = { text: 'select 1', keyCount: 0, totalCount: 1 } as unknown as BoundedQuery
    const dressed = Object.create(BoundedQuery.prototype) as BoundedQuery
    await expect(vault.ask(lookAlike, options())).rejects.toThrow('bounded queries only')
    await expect(vault.ask(dressed, options())).rejects.toMatchObject({ code: 'vault' })
    expect(await running('select 1')).toBe(0)
  })

  test('gives keys as text and totals to the last digit', async () => {
    const big = '9'.repeat(60)
    const table = await vault.ask(query(`select district, null::text, count(*), -${big}::numeric from public.riders group by district`, 2, 2), options())
    expect(rowsOf(table)).toEqual([{ keys: ['Northbank', null], values: [100n, -BigInt(big)] }])
  })

  test('uses the time zone asked for, for that query alone', async () => {
    const hour = query(`select timestamptz '2026-06-01 00:00+00'::text, 1`, 1, 1)
    expect(rowsOf(await vault.ask(hour, options({ timeZone: 'Asia/Tokyo' })))[0]?.keys).toEqual(['2026-06-01 09:00:00+09'])
    expect(rowsOf(await vault.ask(hour, options({ timeZone: 'UTC' })))[0]?.keys).toEqual(['2026-06-01 00:00:00+00'])
  })

  test('prints dates, intervals and floats one way, whatever the role has set', async () => {
    await sql(
      `alter role ${role} set datestyle = 'German'; alter role ${role} set intervalstyle = 'iso_8601'; alter role ${role} set extra_float_digits = -10; alter role ${role} set search_path = public; alter role ${role} set default_transaction_read_only = off`,
    )
    const own = await connectVault({ url: reader, statementTimeoutMs: 5_000, maxConnections: 1, log })
    const table = await own.ask(
      query(`select date '2026-12-01', interval '1 day 2 hours', 0.1::float8 + 0.2::float8, current_schemas(false)::text, 1`, 4, 1),
      options(),
    )
    expect(rowsOf(table)[0]?.keys).toEqual(['2026-12-01', '1 day 02:00:00', '0.30000000000000004', '{pg_catalog}'])
    await own.close()
    await sql(`alter role ${role} reset all`)
  })

  test('runs in one read-only snapshot', async () => {
    const table = await vault.ask(query(`select current_setting('transaction_read_only'), current_setting('transaction_isolation'), 1`, 2, 1), options())
    expect(rowsOf(table)[0]?.keys).toEqual(['on', 'repeatable read'])
    const own = await connectVault({ url: superuser, statementTimeoutMs: 5_000, maxConnections: 1, log })
    const writing = own.ask(query(`insert into public.riders values (0, 'nobody', '') returning 1`, 0, 1), options())
    await expect(writing).rejects.toMatchObject({ code: 'vault' })
    expect(await sql('select from public.riders where rider_id = 0')).toEqual([])
    await own.close()
  })
})

describe('an error of the vault', () => {
  test.each([
    ['a division by zero', `select 1 / (count(*) - 100) from public.riders`],
    ['a cast that quotes a name', `select max(name)::int from public.riders`],
    ['a raised text growth', `select length(repeat(max(name), 1000000000)) from public.riders`],
    ['a table that is not there', `select count(*) from public.secret_piers`],
  ])('%s is a failure with a reference, and its text is nowhere', async (_, text) => {
    const failure: unknown = await vault.ask(query(text, 0, 1), options()).catch((error: unknown) => error)
    expect(failure).toMatchObject({ name: 'Failure', code: 'vault' })
    const { reference } = failure as { reference: string }
    expect(logged).toEqual([['error', 'vault query failed', { reference }]])
    expect(`${String(failure)} ${JSON.stringify(failure)} ${(failure as Error).stack} ${JSON.stringify(logged)}`).not.toMatch(
      /zero|Rider|integer|invalid|secret_piers|22\w{3}|42\w{3}/,
    )
    expect((failure as Error).cause).toBeUndefined()
    expect(rowsOf(await vault.ask(query('select 1', 0, 1), options()))).toEqual([{ keys: [], values: [1n] }])
  })

  test('an answer of another shape is our own failure', async () => {
    await expect(vault.ask(query('select 1, 2', 0, 1), options())).rejects.toMatchObject({ code: 'internal' })
    await expect(vault.ask(query(`select 'Rider 1'`, 0, 1), options())).rejects.toMatchObject({ code: 'internal' })
    expect(JSON.stringify(logged)).not.toContain('Rider')
  })

  test('a time zone the vault does not know is a failure', async () => {
    await expect(vault.ask(query('select 1', 0, 1), options({ timeZone: 'Sea/Nowhere' }))).rejects.toMatchObject({ code: 'vault' })
  })
})

describe('stopping', () => {
  test('an abort rejects at once with its reason and stops the query within 200 ms', async () => {
    const stop = new AbortController()
    const asked = vault.ask(query(`select 1 /* stop-me */ from pg_sleep(30)`, 0, 1), options({ signal: stop.signal })).catch((error: unknown) => error)
    await until(async () => (await running('stop-me')) === 1, 5_000)
    const reason = new Error('cancelled by the client')
    const start = performance.now()
    stop.abort(reason)
    expect(await asked).toBe(reason)
    expect(performance.now() - start).toBeLessThan(50)
    await until(async () => (await running('stop-me')) === 0, 200)
    expect(logged).toEqual([])
  })

  test('a query that only computes is stopped as well', async () => {
    const stop = new AbortController()
    const asked = vault
      .ask(query(`select sum(a) /* busy-one */ from generate_series(1, 2000000000) a`, 0, 1), options({ signal: stop.signal }))
      .catch((error: unknown) => error)
    await until(async () => (await running('busy-one')) === 1, 5_000)
    stop.abort()
    await asked
    await until(async () => (await running('busy-one')) === 0, 3_000)
  })

  test('the deadline is a failure of its own, and stops the query', async () => {
    const start = performance.now()
    await expect(vault.ask(query('select 1 /* too-slow */ from pg_sleep(30)', 0, 1), options({ deadlineMs: 150 }))).rejects.toMatchObject({ code: 'deadline' })
    expect(performance.now() - start).toBeLessThan(1_000)
    await until(async () => (await running('too-slow')) === 0, 3_000)
  })

  test('the deadline holds while every connection is taken, and those come back', async () => {
    const stop = new AbortController()
    const held = [1, 2].map(async () => vault.ask(query('select 1 from pg_sleep(30)', 0, 1), options({ signal: stop.signal })).catch(() => 'stopped'))
    await expect(vault.ask(query('select 1', 0, 1), options({ deadlineMs: 100 }))).rejects.toMatchObject({ code: 'deadline' })
    const waiting = new AbortController()
    const third = vault.ask(query('select 1', 0, 1), options({ signal: waiting.signal })).catch((error: unknown) => error)
    waiting.abort(new Error('no longer wanted'))
    expect(await third).toMatchObject({ message: 'no longer wanted' })
    stop.abort()
    expect(await Promise.all(held)).toEqual(['stopped', 'stopped'])
    const after = await Promise.all(Array.from({ length: 20 }, async (_, n) => rowsOf(await vault.ask(query(`select ${n}`, 0, 1), options()))[0]?.values[0]))
    expect(after).toEqual(Array.from({ length: 20 }, (_, n) => BigInt(n)))
  })

  test('many aborts in any state leave no connection behind', async () => {
    for (let n = 0; n < 30; n++) {
      const stop = new AbortController()
      const asked = vault.ask(query('select 1 from pg_sleep(0.02)', 0, 1), options({ signal: stop.signal })).catch(() => null)
      await new Promise((resolve) => setTimeout(resolve, n % 10))
      stop.abort()
      await asked
    }
    expect(rowsOf(await vault.ask(query('select 7', 0, 1), options()))[0]?.values).toEqual([7n])
    await until(async () => (await sql(`select from pg_stat_activity where usename = '${role}' and application_name = 'hedgerow'`)).length <= 2, 3_000)
  })

  test('an aborted signal asks nothing', async () => {
    await expect(vault.ask(query('select 1', 0, 1), options({ signal: AbortSignal.abort(new Error('too late')) }))).rejects.toThrow('too late')
  })
})

describe('a large answer', () => {
  test('is a failure beyond the row ceiling, without its rows being kept', async () => {
    const before = process.memoryUsage().rss
    await expect(vault.ask(query(`select repeat('x', 200), n from generate_series(1, 3000000) n`, 1, 1), options())).rejects.toMatchObject({ code: 'vault' })
    expect(process.memoryUsage().rss - before).toBeLessThan(150e6)
    await expect(vault.ask(query(`select n from generate_series(1, 50001) n`, 0, 1), options())).rejects.toMatchObject({ code: 'vault' })
    expect(rowsOf(await vault.ask(query(`select n from generate_series(1, 50000) n`, 0, 1), options()))).toHaveLength(50_000)
  })

  test('is a failure when a single value is too long, before it is here', async () => {
    await expect(vault.ask(query(`select repeat('x', 12000000) /* long-one */, 1`, 1, 1), options())).rejects.toMatchObject({ code: 'vault' })
    await until(async () => (await running('long-one')) === 0, 3_000)
  })
})

describe('connecting', () => {
  test('names what the role may do beyond reading', async () => {
    expect(vault.warnings).toEqual([])
    const asSuperuser = await connectVault({ url: superuser, statementTimeoutMs: 5_000, maxConnections: 1, log })
    expect(asSuperuser.warnings).toEqual([expect.stringMatching(/^the vault's role \S+ is a superuser: give Hedgerow a role that may only SELECT/)])
    await asSuperuser.close()
    await sql(`grant update on public.riders to ${role}; alter role ${role} createdb bypassrls`)
    const writer = await connectVault({ url: reader, statementTimeoutMs: 5_000, maxConnections: 1, log })
    expect(writer.warnings.map((warning) => warning.replace(role, 'reader').split(':')[0])).toEqual([
      `the vault's role reader may change tables`,
      `the vault's role reader may make roles or databases`,
      `the vault's role reader passes by row security`,
    ])
    await writer.close()
    await sql(`revoke update on public.riders from ${role}; alter role ${role} nocreatedb nobypassrls`)
  })

  test("that cannot be done says why, without the server's own text", async () => {
    const wrong = new URL(reader)
    wrong.pathname = '/no_such_harbour'
    await expect(connectVault({ url: wrong.href, statementTimeoutMs: 5_000, maxConnections: 1, log })).rejects.toThrow(
      'the vault cannot be reached: there is no database of that name',
    )
    await expect(connectVault({ url: 'postgresql://x@127.0.0.1:1/x', statementTimeoutMs: 5_000, maxConnections: 1, log })).rejects.toThrow(
      'nothing listens at that host and port',
    )
  })

  test('lasts when the vault drops every connection', async () => {
    await vault.ask(query('select 1', 0, 1), options())
    await sql(`select pg_terminate_backend(pid) from pg_stat_activity where usename = '${role}'`)
    expect(rowsOf(await vault.ask(query('select 2', 0, 1), options()))[0]?.values).toEqual([2n])
    const stop = new AbortController()
    const asked = vault.ask(query('select 1 /* after-restart */ from pg_sleep(30)', 0, 1), options({ signal: stop.signal })).catch(() => null)
    await until(async () => (await running('after-restart')) === 1, 5_000)
    stop.abort()
    await asked
    await until(async () => (await running('after-restart')) === 0, 3_000)
  })

  test('a connection lost while a query runs is a failure', async () => {
    const asked = vault.ask(query('select 1 /* pull-the-plug */ from pg_sleep(30)', 0, 1), options()).catch((error: unknown) => error)
    await until(async () => (await running('pull-the-plug')) === 1, 5_000)
    await sql(`select pg_terminate_backend(pid) from pg_stat_activity where query like '%pull-the-plug%' and pid <> pg_backend_pid()`)
    expect(await asked).toMatchObject({ code: 'vault' })
  })
})

describe('a session for the catalogue', () => {
  test("reads in a read-only snapshot and hides the server's errors", async () => {
    const rows = await vault.session(
      async (client) => (await client.query({ text: `select relname from pg_class where oid = 'public.riders'::regclass`, rowMode: 'array' })).rows,
    )
    expect(rows).toEqual([['riders']])
    await expect(vault.session(async (client) => client.query({ text: 'create table public.t ()', rowMode: 'array' }))).rejects.toMatchObject({
      code: 'vault',
    })
    await expect(vault.session(() => Promise.reject(new Error('the vault must be newer')))).rejects.toThrow('the vault must be newer')
  })
})
