import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { OpenLedger } from '../../src/ledger/open.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { account, cap, charge, note, open, sql } from './fixture.ts'

let server: TestServer
let url: string
let ledger: OpenLedger

beforeAll(async () => {
  server = await testServer()
  url = await server.createDatabase('ledger_period')
  ledger = await open(url)
}, 60_000)

afterAll(async () => {
  await ledger.close()
  await server.stop()
})

async function setPeriod(id: string, period: string): Promise<void> {
  await sql(url, 'update ledger.accounts set period = $2 where id = $1', [id, period])
}

describe('a renewed budget', () => {
  test('starts again in a new period, while what was spent over all periods goes on', async () => {
    const monthly = account('p1', cap('1', '1', '0', 'month'))
    await ledger.debit([monthly], charge(null, '1'), null, note)
    expect((await ledger.debit([monthly], charge('0.1', '0.1'), null, note)).kind).toBe('spent')
    await setPeriod('p1', '2020-01')
    const outcome = await ledger.debit([monthly], charge('0.25', '0.5'), null, note)
    const now = new Date().toISOString().slice(0, 7)
    const [balance] = outcome.balances
    expect([outcome.kind, balance?.period, balance?.epsilonSpent?.toString(), balance?.rhoSpent.toString(), balance?.rhoEver.toString()]).toEqual([
      'debited',
      now,
      '1/4',
      '1/2',
      '3/2',
    ])
  })

  test('is not renewed a second time when the clock is set back', async () => {
    const monthly = account('p2', cap('1', '1', '0', 'month'))
    await ledger.debit([monthly], charge('1', '1'), null, note)
    await setPeriod('p2', '9999-12')
    expect((await ledger.debit([monthly], charge('0.5', '0.5'), null, note)).kind).toBe('spent')
    const [balance] = await ledger.balances([monthly])
    expect(balance?.period).toBe('9999-12')
  })

  test.each([
    ['never', /^always$/],
    ['month', /^\d{4}-(0[1-9]|1[0-2])$/],
    ['quarter', /^\d{4}-Q[1-4]$/],
    ['year', /^\d{4}$/],
  ] as const)('that renews %s names its period', async (renews, form) => {
    const [balance] = await ledger.balances([account(`p3/${renews}`, cap('1', '1', '0', renews))])
    expect(balance?.period).toMatch(form)
  })

  test('counts what was spent before in the same quarter when the policy changes from month to quarter', async () => {
    const [monthly, quarterly] = (['month', 'quarter'] as const).map((renews) => account('p4', cap('10', '10', '0', renews)))
    if (monthly === undefined || quarterly === undefined) throw new Error('two accounts')
    await ledger.debit([monthly], charge('1', '1'), null, note)
    await setPeriod('p4', '2020-01')
    await ledger.debit([monthly], charge('2', '2'), null, note)
    expect((await ledger.balances([monthly]))[0]?.epsilonSpent?.toString()).toBe('2')
    expect((await ledger.balances([quarterly]))[0]?.epsilonSpent?.toString()).toBe('3')
    const outcome = await ledger.debit([quarterly], charge(null, '4'), null, note)
    expect(outcome.balances[0]?.epsilonSpent).toBeNull()
    expect(outcome.balances[0]?.rhoSpent.toString()).toBe('7')
    expect(outcome.balances[0]?.rhoEver.toString()).toBe('7')
  })

  test('that is renewed no more counts everything ever spent, and one that renews from now on keeps what this period took', async () => {
    const [yearly, forever] = (['year', 'never'] as const).map((renews) => account('p5', cap('10', '10', '0', renews)))
    if (yearly === undefined || forever === undefined) throw new Error('two accounts')
    await ledger.debit([yearly], charge('6', '6'), null, note)
    await setPeriod('p5', '2019')
    await ledger.debit([yearly], charge('3', '3'), null, note)
    expect((await ledger.debit([forever], charge('2', '2'), null, note)).kind).toBe('spent')
    expect((await ledger.debit([forever], charge('1', '1'), null, note)).kind).toBe('debited')
    expect((await ledger.balances([yearly]))[0]?.epsilonSpent?.toString()).toBe('10')
  })

  test('turns at midnight in UTC, wherever the server stands', async () => {
    const [row] = await sql(
      url,
      `select ledger.period_at('year', '2026-12-31 23:59:59.9+00') as old, ledger.period_at('quarter', '2027-01-01 00:00+00') as new from set_config('timezone', 'Pacific/Kiritimati', false)`,
    )
    expect(row).toEqual({ old: '2026', new: '2027-Q1' })
  })
})
