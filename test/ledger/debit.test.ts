import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import type { OpenLedger } from '../../src/ledger/open.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { account, cap, charge, note, open, sql } from './fixture.ts'

let server: TestServer
let url: string
let ledger: OpenLedger
let other: OpenLedger

beforeAll(async () => {
  server = await testServer()
  url = await server.createDatabase('ledger_debit')
  ledger = await open(url)
  other = await open(url)
}, 60_000)

afterAll(async () => {
  await ledger.close()
  await other.close()
  await server.stop()
})

describe('a debit', () => {
  test('of 200 different statements that race for the last charge, exactly one passes', async () => {
    const ana = account('k1/analyst/ana', cap('1', '0.5'))
    const everyone = account('k1/everyone', cap('100', '100'))
    await ledger.debit([ana, everyone], charge('0.9', '0.45'), null, note)
    // The row is held until every connection of both pools stands before it, so that they do race.
    const holder = new pg.Client({ connectionString: url })
    await holder.connect()
    await holder.query('begin; select from ledger.accounts for update')
    const racing = Array.from({ length: 200 }, async (_, n) => {
      const door = n % 2 === 0 ? ledger : other
      return door.debit(n % 3 === 0 ? [everyone, ana] : [ana, everyone], charge('0.1', '0.05'), null, { ...note, fingerprint: `${n}` })
    })
    const waiting = `select from pg_stat_activity where application_name = 'hedgerow ledger' and wait_event_type = 'Lock' and datname = current_database()`
    while ((await sql(url, waiting)).length < 16) await new Promise((resolve) => setTimeout(resolve, 10))
    await holder.end()
    const outcomes = await Promise.all(racing)
    expect(outcomes.filter(({ kind }) => kind === 'debited')).toHaveLength(1)
    const [balance, all] = await ledger.balances([ana, everyone])
    expect(balance?.epsilonSpent?.toString()).toBe('1')
    expect(all?.rhoSpent.equals(Fraction.parse('0.5'))).toBe(true)
    expect(await ledger.charges('ana', 'ferries', 1000)).toHaveLength(2)
    expect(await ledger.verify()).toEqual({ kind: 'whole', charges: 2 })
  }, 30_000)

  test('lies on all its accounts or on none, and names the first that cannot bear it in the order given', async () => {
    const ben = account('k2/analyst/ben', cap('5', '5'))
    const everyone = account('k2/everyone', cap('1', '1'))
    const outcome = await ledger.debit([everyone, ben], charge('2', '2'), null, note)
    expect(outcome).toMatchObject({ kind: 'spent', account: 'k2/everyone' })
    const both = await ledger.debit([ben, everyone], charge('9', '9'), null, note)
    expect(both).toMatchObject({ kind: 'spent', account: 'k2/analyst/ben' })
    for (const balance of await ledger.balances([ben, everyone])) expect([balance.rhoSpent.toString(), balance.epsilonSpent?.toString()]).toEqual(['0', '0'])
    expect(outcome.balances.map(({ account: id }) => id)).toEqual(['k2/everyone', 'k2/analyst/ben'])
  })

  test('must leave room for what the statement will still ask for, and does not take it', async () => {
    const limits = cap('1', '0')
    expect((await ledger.debit([account('k3/a', limits)], charge('0.5', '1'), charge('0.6', '1'), note)).kind).toBe('spent')
    expect((await ledger.debit([account('k3/a', limits)], charge('0.5', '1'), charge('0.5', '1'), note)).kind).toBe('debited')
    const [balance] = await ledger.balances([account('k3/a', limits)])
    expect(balance?.epsilonSpent?.toString()).toBe('1/2')
    expect((await ledger.debit([account('k3/a', limits)], charge('0.1', '1'), charge(null, '1'), note)).kind).toBe('spent')
  })

  test('without a pure epsilon closes that track for the period and leaves rho to decide', async () => {
    const limits = cap('1000', '1')
    expect((await ledger.debit([account('k4/a', limits)], charge(null, '0.6'), null, note)).kind).toBe('debited')
    const [balance] = await ledger.balances([account('k4/a', limits)])
    expect(balance?.epsilonSpent).toBeNull()
    expect((await ledger.debit([account('k4/a', limits)], charge('0.1', '0.5'), null, note)).kind).toBe('spent')
    expect((await ledger.debit([account('k4/a', limits)], charge('0.1', '0.4'), null, note)).kind).toBe('debited')
  })

  test('that exceeds the pot for key selections is refused whatever the tracks say', async () => {
    const limits = cap('1000', '1000', '5e-7')
    expect((await ledger.debit([account('k5/a', limits)], charge('1', '1', '5.1e-7'), null, note)).kind).toBe('spent')
    expect((await ledger.debit([account('k5/a', limits)], charge('1', '1', '5e-7'), null, note)).kind).toBe('debited')
    expect((await ledger.debit([account('k5/a', limits)], charge('1', '1', '1e-20'), null, note)).kind).toBe('spent')
  })

  test('adds amounts of 1e30 and of 1e-20 without losing a digit, and rounds what is finer against the analyst', async () => {
    const limits = cap('1e31', '1e31', '1')
    await ledger.debit([account('k6/a', limits)], charge('1e30', '1e30', '1e-20'), null, note)
    const outcome = await ledger.debit([account('k6/a', limits)], charge('1e-12', '1e-15', '1.5e-20'), null, note)
    const [balance] = outcome.balances
    expect(balance?.epsilonSpent?.equals(Fraction.parse('1000000000000000000000000000000.000000000001'))).toBe(true)
    expect(balance?.rhoSpent.equals(Fraction.parse('1000000000000000000000000000000.000000000000001'))).toBe(true)
    expect(balance?.deltaSpent.equals(Fraction.parse('3e-20'))).toBe(true)
    expect(await ledger.balances([account('k6/a', limits)])).toEqual(outcome.balances)
  })

  test('shows in the charges of its analyst with its exact amounts and its note, latest first', async () => {
    const mine = { ...note, analyst: 'cleo' }
    await ledger.debit([account('k7/a', cap('9', '9', '1'))], charge('0.25', '0.125', '1e-9'), null, mine)
    await ledger.debit([account('k7/a', cap('9', '9', '1'))], charge(null, '0.5'), null, { ...mine, application: 'second' })
    const entries = await ledger.charges('cleo', 'ferries', 10)
    expect(entries.map(({ note: { application } }) => application)).toEqual(['second', 'psql'])
    expect(entries[1]?.note).toEqual(mine)
    expect(entries[1]?.charge).toEqual(charge('0.25', '0.125', '1e-9'))
    expect(entries[0]?.charge.epsilon).toBeNull()
    expect(Math.abs(Date.now() - Date.parse(entries[0]?.at ?? ''))).toBeLessThan(3_600_000)
    expect(await ledger.charges('cleo', 'harbours', 10)).toEqual([])
  })

  test('takes names with quotes, commas, braces and non-ASCII letters', async () => {
    const odd = account(`k8/analyst/o'neil "x", {é} \\ NULL`, cap('9', '9'))
    expect((await ledger.debit([odd], charge('1', '1'), null, note)).kind).toBe('debited')
    const [balance] = await ledger.balances([odd])
    expect(balance?.epsilonSpent?.toString()).toBe('1')
    expect((await ledger.verify()).kind).toBe('whole')
  })

  test('over the same two accounts in either order never deadlocks', async () => {
    const pair = [account('k9/a', cap('1e9', '1e9')), account('k9/b', cap('1e9', '1e9'))]
    const outcomes = await Promise.all(
      Array.from({ length: 60 }, async (_, n) => (n % 2 ? ledger : other).debit(n % 4 < 2 ? pair : pair.toReversed(), charge('1', '1'), null, note)),
    )
    expect(outcomes.every(({ kind }) => kind === 'debited')).toBe(true)
    const [balance] = await ledger.balances(pair)
    expect(balance?.epsilonSpent?.toString()).toBe('60')
  })

  test('keeps the answer that was stored first, and gives back nothing for a charge without one', async () => {
    const outcome = await ledger.debit([account('k10/a', cap('9', '9'))], charge('1', '1'), null, note)
    const id = outcome.kind === 'debited' ? outcome.id : ''
    expect(await ledger.stored(id)).toBeNull()
    await ledger.store(id, '{"rows":[["Northbank",12]]}')
    await ledger.store(id, '{"rows":[]}')
    expect(await other.stored(id)).toBe('{"rows":[["Northbank",12]]}')
    await expect(ledger.store('00000000-0000-4000-8000-000000000000', '{}')).rejects.toMatchObject({ code: 'ledger' })
  })
})
