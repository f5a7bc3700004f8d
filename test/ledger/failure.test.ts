import { createServer, connect } from 'node:net'
import type { AddressInfo, Socket } from 'node:net'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import pg from 'pg'
import type { OpenLedger } from '../../src/ledger/open.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { account, cap, charge, note, open, recorder, sql } from './fixture.ts'

let server: TestServer
let url: string
let ledger: OpenLedger
const { log, events } = recorder()

beforeAll(async () => {
  server = await testServer()
  url = await server.createDatabase('ledger_failure')
  ledger = await open(url, 4, log)
}, 60_000)

afterAll(async () => {
  await ledger.close()
  await server.stop()
})

interface Relay {
  readonly url: string
  /** From now on the client is cut off where its bytes hold `word`, which is sent on first or not at all. */
  cutAt(word: string, sentOn: boolean): void
  close(): void
}

async function relayTo(target: string): Promise<Relay> {
  let cut = { word: '', sentOn: false }
  const relay = createServer((client) => {
    const far: Socket = connect(server.port, server.host)
    far.on('data', (bytes) => client.write(bytes))
    client.on('data', (bytes) => {
      const meets = cut.word !== '' && bytes.includes(cut.word)
      if (!meets || cut.sentOn) far.write(bytes)
      if (meets) client.destroy()
    })
    client.on('error', () => undefined)
    far.on('error', () => undefined)
    client.on('close', () => far.end())
    far.on('close', () => client.destroy())
  })
  await new Promise<void>((resolve) => relay.listen(0, '127.0.0.1', resolve))
  const through = new URL(target)
  through.hostname = '127.0.0.1'
  through.port = String((relay.address() as AddressInfo).port)
  return { url: through.href, cutAt: (word, sentOn) => void (cut = { word, sentOn }), close: () => relay.close() }
}

async function waitFor(held: () => Promise<boolean>): Promise<void> {
  for (const end = Date.now() + 5_000; Date.now() < end; await new Promise((resolve) => setTimeout(resolve, 20))) if (await held()) return
  throw new Error('never came true')
}

describe('a debit whose connection is lost while the commit is on its way', () => {
  test.each([
    ['stands where the server had it, though its sender is told of a failure', true, '1'],
    ['is not made where the server never had it', false, '0'],
  ])('%s', async (_, sentOn, spent) => {
    const ana = account(`f1/${spent}`, cap('9', '9'))
    const relay = await relayTo(url)
    const cut = await open(relay.url, 1)
    relay.cutAt('commit\0', sentOn)
    await expect(cut.debit([ana], charge('1', '1'), null, note)).rejects.toMatchObject({ code: 'ledger' })
    await waitFor(
      async () =>
        (await sql(url, `select from pg_locks l join pg_class c on c.oid = l.relation where c.relname = 'head' and l.mode = 'RowExclusiveLock'`)).length === 0,
    )
    expect((await ledger.balances([ana]))[0]?.epsilonSpent?.toString()).toBe(spent)
    expect((await ledger.verify()).kind).toBe('whole')
    await cut.close()
    relay.close()
  })
})

describe('a lost connection', () => {
  test('that was idle costs nothing: the debit is made on another one', async () => {
    const ana = account('f2', cap('9', '9'))
    const terminate = `select pg_terminate_backend(pid) from pg_stat_activity where application_name = 'hedgerow ledger' and datname = current_database()`
    await ledger.balances([ana])
    await sql(url, terminate)
    expect(await ledger.charges('nobody', 'ferries', 1)).toEqual([])
    await sql(url, terminate)
    expect((await ledger.debit([ana], charge('1', '1'), null, note)).kind).toBe('debited')
    expect((await ledger.balances([ana]))[0]?.epsilonSpent?.toString()).toBe('1')
  })

  test('before the commit leaves nothing behind, and is tried once more', async () => {
    const ana = account('f3', cap('9', '9'))
    const holder = new pg.Client({ connectionString: url })
    await holder.connect()
    await holder.query('begin')
    await holder.query('select from ledger.head for update')
    const waiting = async (): Promise<boolean> =>
      (await sql(url, `select from pg_stat_activity where application_name = 'hedgerow ledger' and wait_event_type = 'Lock' and datname = current_database()`))
        .length > 0
    const kill = `select pg_terminate_backend(pid) from pg_stat_activity where application_name = 'hedgerow ledger' and wait_event_type = 'Lock' and datname = current_database()`
    const first = ledger.debit([ana], charge('1', '1'), null, note)
    await waitFor(waiting)
    await sql(url, kill)
    await waitFor(waiting)
    await holder.query('rollback')
    expect((await first).kind).toBe('debited')
    await holder.query('begin')
    await holder.query('select from ledger.head for update')
    const second = ledger.debit([ana], charge('1', '1'), null, note).catch((error: unknown) => error)
    for (const _ of [1, 2]) {
      await waitFor(waiting)
      await sql(url, kill)
    }
    expect(await second).toMatchObject({ code: 'ledger' })
    await holder.end()
    expect((await ledger.balances([ana]))[0]?.epsilonSpent?.toString()).toBe('1')
    expect((await ledger.verify()).kind).toBe('whole')
  })

  test('is logged with a reference, never with a text', async () => {
    await expect(ledger.store('not a uuid', '{"secret":1}')).rejects.toMatchObject({ code: 'ledger' })
    const logged = events.filter(({ event }) => event === 'ledger failed').at(-1)
    expect(logged?.fields).toEqual({ reference: expect.stringMatching(/^[0-9a-f]{8}$/), during: 'store', sqlstate: '22P02' })
  })
})
