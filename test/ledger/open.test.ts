import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { openLedger } from '../../src/ledger/open.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { account, cap, charge, macKey, note, open, recorder, sql } from './fixture.ts'

let server: TestServer

beforeAll(async () => {
  server = await testServer()
}, 60_000)

afterAll(async () => {
  await server.stop()
})

describe('opening the ledger', () => {
  test('from several programs at once makes its schema once, and again changes nothing', async () => {
    const url = await server.createDatabase('ledger_open')
    const ledgers = await Promise.all([1, 2, 3, 4].map(async () => open(url, 1)))
    await ledgers[0]?.debit([account('o', cap('9', '9'))], charge('1', '1'), null, note)
    await Promise.all(ledgers.map(async (ledger) => ledger.close()))
    const again = await open(url)
    expect(await again.verify()).toEqual({ kind: 'whole', charges: 1 })
    await again.close()
    expect(await sql(url, 'select step from ledger.version')).toEqual([{ step: 1 }])
  })

  test('on a server that could forget a debit is refused, and said where it is allowed', async () => {
    const url = await server.createDatabase('ledger_open')
    const [row] = await sql(url, `select current_setting('fsync') as fsync`)
    const { log, events } = recorder()
    const strict = await openLedger({ url, macKey, log }).catch((error: unknown) => error)
    if (row?.['fsync'] === 'on') return (strict as { close(): Promise<void> }).close()
    expect(strict).toMatchObject({
      name: 'LedgerUnfit',
      message: expect.stringMatching(/^the ledger's server has fsync.* off, so a crash could forget a debit/),
    })
    const ledger = await open(url, 1, log)
    expect(events).toMatchObject([{ level: 'warn', event: expect.stringContaining('ledger is unsafe'), fields: { off: expect.stringContaining('fsync') } }])
    await ledger.close()
  })

  test('commits durably whatever the server and the database have as their default', async () => {
    const url = await server.createDatabase('ledger_open')
    await sql(url, `do $$ begin execute format('alter database %I set synchronous_commit = off', current_database()); end $$`)
    const { log, events } = recorder()
    const ledger = await open(url, 1, log)
    expect(JSON.stringify(events)).not.toContain('synchronous_commit')
    await ledger.close()
  })

  test('with another key than it was written with is refused', async () => {
    const url = await server.createDatabase('ledger_open')
    await (await open(url)).close()
    const other = new Uint8Array(32).fill(8)
    await expect(openLedger({ url, macKey: other, log: () => undefined, allowUnsafe: true })).rejects.toThrow('not sealed with this key')
  })

  test('with a short key is refused', async () => {
    await expect(openLedger({ url: server.url(), macKey: new Uint8Array(16), log: () => undefined })).rejects.toThrow('the key of the ledger has 16 bytes')
  })

  test('made by a later program is refused', async () => {
    const url = await server.createDatabase('ledger_open')
    await (await open(url)).close()
    await sql(url, 'insert into ledger.version (step) values (99)')
    await expect(open(url)).rejects.toThrow(`the ledger's schema is at step 99 and this program knows 1`)
  })

  test('where nothing listens says so', async () => {
    await expect(open('postgresql://postgres@127.0.0.1:1/ledger')).rejects.toThrow(/^the ledger cannot be opened: .*ECONNREFUSED/)
  })
})
