import { afterAll, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import type { OpenLedger } from '../../src/ledger/open.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { account, cap, charge, note, open, sql } from './fixture.ts'

let server: TestServer
let url: string
let ledger: OpenLedger
let ids: string[]

const ana = account('c/analyst/ana', cap('100', '100', '1', 'month'))
const everyone = account('c/everyone', cap('100', '100', '1'))

beforeAll(async () => {
  server = await testServer()
  url = await server.createDatabase('ledger_chain')
}, 60_000)

afterAll(async () => {
  await server.stop()
})

beforeEach(async () => {
  await sql(url, 'drop schema if exists ledger cascade')
  ledger = await open(url, 2)
  ids = []
  for (let n = 1; n <= 5; n++) {
    const outcome = await ledger.debit([ana, everyone], charge(n === 4 ? null : `${n}`, `0.${n}`, `${n}e-9`), null, { ...note, fingerprint: `${n}` })
    if (outcome.kind === 'debited') ids.push(outcome.id)
  }
  await ledger.store(ids[1] ?? '', '{"rows":[]}')
  return async () => ledger.close()
})

/** What someone with every right in the database can do. */
async function tamper(text: string): Promise<void> {
  await sql(url, `begin; set local session_replication_role = replica; ${text}; commit`)
}

describe('the chain', () => {
  test('is whole as written', async () => {
    expect(await ledger.verify()).toEqual({ kind: 'whole', charges: 5 })
  })

  test('stays whole when the policy changes how an account renews', async () => {
    const quarterly = account('c/analyst/ana', cap('100', '100', '1', 'quarter'))
    await ledger.debit([quarterly], charge('1', '0.1', '1e-9'), null, note)
    await ledger.debit([ana, everyone], charge('1', '0.1', '1e-9'), null, note)
    expect(await ledger.verify()).toEqual({ kind: 'whole', charges: 7 })
  })

  test.each([
    ['an amount', `update ledger.charges set rho = rho - 1 where seq = 3`],
    ['an epsilon set where there was none', `update ledger.charges set epsilon = 1 where seq = 4`],
    ['a time', `update ledger.charges set at = at + interval '1 microsecond' where seq = 3`],
    ['an account', `update ledger.charges set accounts[1] = 'c/analyst/ben' where seq = 3`],
    ['a period', `update ledger.charges set periods[1] = '2020-01' where seq = 3`],
    ['a word of the note', `update ledger.charges set note = jsonb_set(note, '{analyst}', '"ben"') where seq = 3`],
    ['a predecessor', `update ledger.charges set previous_mac = '\\x00' where seq = 3`],
  ])('shows the row in which %s was edited', async (_, text) => {
    await tamper(text)
    const seq = text.slice(-1)
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq, reason: `charge ${seq} was edited` })
  })

  test('shows a row that was taken out', async () => {
    await tamper('delete from ledger.charges where seq = 3')
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq: '3', reason: 'charge 3 is missing: the next one is 4' })
  })

  test('shows rows that were taken out and numbered anew', async () => {
    await tamper(
      'delete from ledger.charges where seq = 3; update ledger.charges set seq = 3 where seq = 4; update ledger.charges set seq = 4 where seq = 5; update ledger.head set seq = 4',
    )
    expect(await ledger.verify()).toMatchObject({ kind: 'broken', seq: '3' })
  })

  test('shows two rows that were swapped', async () => {
    await tamper(
      'update ledger.charges set seq = 99 where seq = 2; update ledger.charges set seq = 2 where seq = 3; update ledger.charges set seq = 3 where seq = 99',
    )
    expect(await ledger.verify()).toMatchObject({ kind: 'broken', seq: '2' })
  })

  test('shows a cut end, also where the head was moved back to the row that is left', async () => {
    await tamper('delete from ledger.charges where seq = 5')
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq: '5', reason: 'charge 5 is missing: the chain went on to 5' })
    await tamper('update ledger.head h set seq = c.seq, mac = c.mac from ledger.charges c where c.seq = 4')
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq: '4', reason: 'the end of the chain after charge 4 was edited' })
  })

  test('takes no debit after a head that was not sealed with the key', async () => {
    await tamper(`update ledger.head set mac = '\\x${'11'.repeat(32)}'`)
    await expect(ledger.debit([ana], charge('1', '1'), null, note)).rejects.toMatchObject({ code: 'ledger' })
    await expect(open(url)).rejects.toThrow('not sealed with this key')
  })

  test.each([
    ['lowered', `update ledger.accounts set rho_spent = rho_spent - 1 where id = 'c/analyst/ana'`],
    ['opened to the pure track again', `update ledger.accounts set epsilon_spent = 0 where id = 'c/analyst/ana'`],
    ['moved to a later period', `update ledger.accounts set period = '2999-01', rho_spent = 0 where id = 'c/analyst/ana'`],
    ['lowered over all periods', `update ledger.accounts set delta_spent = 0, delta_ever = 0 where id = 'c/analyst/ana'`],
  ])('shows an account that was %s', async (_, text) => {
    await tamper(text)
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq: '', reason: 'account c/analyst/ana was edited: it does not agree with its charges' })
  })

  test('shows an account that was taken out', async () => {
    await tamper(`delete from ledger.accounts where id = 'c/everyone'`)
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq: '', reason: 'account c/everyone is missing' })
  })

  test('shows a stored answer that was edited, and gives it to nobody', async () => {
    await tamper(`update ledger.answers set answer = '{"rows":[1]}'`)
    expect(await ledger.verify()).toEqual({ kind: 'broken', seq: '2', reason: 'the stored answer of charge 2 was edited' })
    await expect(ledger.stored(ids[1] ?? '')).rejects.toMatchObject({ code: 'ledger' })
  })
})

describe('the tables', () => {
  test.each([
    'update ledger.charges set rho = 0',
    'delete from ledger.charges',
    'truncate ledger.charges cascade',
    `update ledger.answers set answer = ''`,
    'delete from ledger.answers',
    'truncate ledger.answers',
    'delete from ledger.accounts',
    'truncate ledger.accounts',
    'delete from ledger.head',
  ])('turn away: %s', async (text) => {
    await expect(sql(url, text)).rejects.toMatchObject({ code: '42501' })
    expect(await ledger.verify()).toEqual({ kind: 'whole', charges: 5 })
  })
})
