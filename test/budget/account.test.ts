import { describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { Fraction } from '../../src/base/fraction.ts'
import { capAmount, fromAmount, spentAmount } from '../../src/budget/amount.ts'
import { accountCap } from '../../src/budget/cap.ts'
import { Debit, debitFrom } from '../../src/budget/debit.ts'
import { statementBudget } from '../../src/budget/statement-budget.ts'

const parse = Fraction.parse

describe('an account cap', () => {
  test('sets half of delta aside where keys may need selection, and converts the rest', () => {
    const cap = accountCap({ epsilon: '1', delta: '1e-6', renews: 'month' }, true)
    expect(cap).toMatchObject({ epsilon: Fraction.one, delta: parse('1e-6'), deltaPot: parse('5e-7'), renews: 'month' })
    // Canonne, Kamath & Steinke 2020; independent 60-digit arithmetic at (1, 5e-7) and (1, 1e-6).
    expect(cap.rhoCap.toDecimal(20, 'down')).toBe('0.02293744668872218283')
    expect(accountCap({ epsilon: '1', delta: '1e-6', renews: 'never' }, false).rhoCap.toDecimal(20, 'down')).toBe('0.02435597035953837289')
    expect(accountCap({ epsilon: '1', delta: '1e-6', renews: 'never' }, false).deltaPot).toEqual(Fraction.zero)
  })

  test('has no rho and no pot without delta', () => {
    expect(accountCap({ epsilon: '1e30', delta: '0', renews: 'never' }, true)).toMatchObject({
      deltaPot: Fraction.zero,
      rhoCap: Fraction.zero,
      epsilon: parse('1e30'),
    })
  })

  test.each([
    ['0', '0'],
    ['-1', '0'],
    ['one', '0'],
    ['1', '0.5'],
    ['1', '-1e-6'],
    ['1', ''],
  ])('is refused for epsilon %j and delta %j', (epsilon, delta) => {
    expect(() => accountCap({ epsilon, delta, renews: 'never' }, false)).toThrow(RangeError)
  })
})

describe('a statement budget', () => {
  const cap = accountCap({ epsilon: '1', delta: '1e-6', renews: 'never' }, false)

  test('is the same share of either track', () => {
    const budget = statementBudget(parse('0.1'), cap)
    expect(budget.epsilon).toEqual(parse('0.1'))
    expect(budget.rho.toDecimal(15, 'down')).toBe('0.002435597035953')
    expect(budget.delta).toEqual(Fraction.zero)
    // Ten of them fit in the ledger's whole units, whatever the cap's digits are.
    expect(10n * BigInt(spentAmount('rho', budget.rho)) <= BigInt(capAmount('rho', cap.rhoCap))).toBe(true)
  })

  test('never buys more rho than epsilon tanh(epsilon/2)', () => {
    // 0.004995837495787997219838636520828432 at 0.1 (Bun & Steinke 2016; independent 60-digit arithmetic), below the share of a large cap.
    const large = accountCap({ epsilon: '10', delta: '1e-5', renews: 'never' }, false)
    const budget = statementBudget(parse('0.1'), large, parse('1e-8'))
    expect(budget.rho.toDecimal(18, 'down')).toBe('0.004995837495787000')
    expect(budget.rho.isAtMost(parse('0.004995837495787997219838636520828433'))).toBe(true)
    expect(budget.delta).toEqual(parse('1e-8'))
  })

  test('has no rho on a pure account, and reaches from 1e-9 to 1e30', () => {
    expect(statementBudget(parse('0.1'), accountCap({ epsilon: '1', delta: '0', renews: 'never' }, true)).rho).toEqual(Fraction.zero)
    const endless = accountCap({ epsilon: '1e30', delta: '1e-6', renews: 'never' }, false)
    expect(statementBudget(parse('1e30'), endless).rho.isAtMost(endless.rhoCap)).toBe(true)
    expect(statementBudget(parse('1e-9'), cap).rho.toDecimal(24, 'down')).toBe('0.000000000000000000499999')
  })
})

describe('an amount in the ledger', () => {
  test('is rounded up where it is spent and down where it is allowed', () => {
    const third = Fraction.make(1n, 3n)
    expect([spentAmount('epsilon', third), capAmount('epsilon', third)]).toEqual(['333333333334', '333333333333'])
    expect([spentAmount('rho', third), capAmount('rho', third)]).toEqual(['333333333333334', '333333333333333'])
    expect([spentAmount('delta', third), capAmount('delta', third)]).toEqual(['33333333333333333334', '33333333333333333333'])
    expect(spentAmount('rho', parse('5e-19'))).toBe('1')
    expect(spentAmount('delta', parse('1e-8'))).toBe('1000000000000')
    expect(capAmount('epsilon', parse('1e30'))).toBe(`1${'0'.repeat(42)}`)
  })

  test('is read back exactly, and nothing else is', () => {
    expect(fromAmount('rho', spentAmount('rho', parse('0.00125')))).toEqual(parse('0.00125'))
    for (const text of ['', '-1', '1.5', '1e3', ' 1', 'null']) expect(() => fromAmount('rho', text)).toThrow(RangeError)
    expect(() => spentAmount('rho', parse('-1'))).toThrow(BrokenCheck)
  })
})

describe('a debit', () => {
  const outcome = () => ({ kind: 'debited', id: '42', balances: [] }) as const

  test('pays for one release', () => {
    const debit = debitFrom(outcome())
    expect(debit.use()).toBe('42')
    expect(() => debit.use()).toThrow(BrokenCheck)
  })

  test('is made once from an outcome, and from none that debited nothing', () => {
    const once = outcome()
    debitFrom(once)
    expect(() => debitFrom(once)).toThrow(BrokenCheck)
    expect(() => debitFrom({ kind: 'spent', account: 'a', balances: [] } as never)).toThrow(BrokenCheck)
    expect(() => new Debit(Symbol('debit'), '42')).toThrow(BrokenCheck)
  })

  test('cannot be printed, copied or spread', () => {
    const debit = debitFrom(outcome())
    expect(() => JSON.stringify({ debit })).toThrow(BrokenCheck)
    expect(() => `${debit as unknown as string}`).toThrow(BrokenCheck)
    expect(Object.keys({ ...debit })).toEqual([])
    expect(() => Debit.prototype.use.call({ ...debit })).toThrow(TypeError)
  })
})
