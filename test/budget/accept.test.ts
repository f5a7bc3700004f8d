import { describe, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { accepts, addCharge, nothingSpent, type Spent } from '../../src/budget/accept.ts'
import { rhoCap } from '../../src/budget/convert.ts'
import { epsilonSpent, gaussianCostsStatements, timesLeft } from '../../src/budget/left.ts'
import type { AccountCap, Charge } from '../../src/budget/ledger.ts'
import { statementBudget } from '../../src/budget/statement-budget.ts'
import { pureRho } from '../../src/noise/laplace-law.ts'

const parse = Fraction.parse

function capOf(epsilon: string, delta: string, pot: string): AccountCap {
  return { epsilon: parse(epsilon), delta: parse(delta), deltaPot: parse(pot), rhoCap: rhoCap(parse(epsilon), parse(delta).sub(parse(pot))), renews: 'never' }
}

function charge(epsilon: string | null, rho: string, delta = '0'): Charge {
  return { epsilon: epsilon === null ? null : parse(epsilon), rho: parse(rho), delta: parse(delta) }
}

/** The decisions of one account over a course of charges, and what was spent in the end. */
function run(cap: AccountCap, charges: readonly Charge[]): { readonly accepted: readonly boolean[]; readonly spent: Spent } {
  let spent = nothingSpent
  const accepted = charges.map((each) => {
    const fits = accepts(cap, spent, each)
    if (fits) spent = addCharge(spent, each)
    return fits
  })
  return { accepted, spent }
}

/** Times the same charge is accepted from the start, at most `ceiling`. */
function fit(cap: AccountCap, each: Charge, ceiling: number): number {
  return run(cap, new Array<Charge>(ceiling).fill(each)).accepted.filter(Boolean).length
}

describe('the acceptance rule', () => {
  test('takes the course of mixed releases that independent arithmetic takes', () => {
    // Cap (1, 1e-6), pot 1e-7; epsilon at delta 9e-7 after each step: Canonne, Kamath & Steinke 2020, independent 60-digit arithmetic.
    const cap = capOf('1', '1e-6', '1e-7')
    expect(cap.rhoCap.toDecimal(18, 'down')).toBe('0.024129622344873095')
    const steps = [
      [charge(null, '0.00125'), true, '0.20711758430454774'], // a count, Gaussian of variance 400
      [charge(null, '0.00125', '2e-8'), true, '0.29919394262973588'], // ten groups, variance 4000, keys selected
      [charge('0.1', '0.00125'), true, '0.37104272799342717'], // a median by the exponential mechanism
      [charge('0.1', '0.0048374180359595731642'), true, '0.57630736198617734'], // a sum, Laplace
      [charge('0.2', '0.019933598924991163424'), false, '0.57630736198617734'], // a count, discrete Laplace: beyond both tracks
      [charge(null, '0.01'), true, '0.86977990739180621'],
      [charge(null, '0.01'), false, '0.86977990739180621'],
    ] as const
    let spent = nothingSpent
    for (const [each, expected, epsilon] of steps) {
      expect(accepts(cap, spent, each)).toBe(expected)
      if (expected) spent = addCharge(spent, each)
      expect(epsilonSpent(cap, spent)?.toDecimal(17, 'down')).toBe(epsilon)
    }
    expect(spent).toEqual({ epsilon: null, rho: parse('0.018587418035959573164').add(parse('2e-22')), delta: parse('2e-8') })
  })

  test('lets pure releases go on to epsilon though they passed rho long ago, and a Gaussian one no more', () => {
    // epsilon 0.1 Laplace costs rho 0.1 + e^-0.1 - 1 (Harrison & Manurangsi 2025): the sixth exceeds the rho of (1, 1e-6).
    const cap = capOf('1', '1e-6', '0')
    const laplace = charge('0.1', '0.0048374180359595731643')
    const { accepted, spent } = run(cap, new Array<Charge>(11).fill(laplace))
    expect(accepted).toEqual([...new Array<boolean>(10).fill(true), false])
    expect(cap.rhoCap.isLess(spent.rho)).toBe(true)
    expect(accepts(cap, spent, charge(null, '1e-15'))).toBe(false)
    const five = run(cap, new Array<Charge>(5).fill(laplace)).spent
    expect(accepts(cap, five, charge(null, '1e-6'))).toBe(true)
    expect(accepts(cap, addCharge(five, charge(null, '1e-6')), laplace)).toBe(false)
  })

  test('keeps key selections within their pot whatever the tracks would bear', () => {
    const cap = capOf('4', '1e-6', '5e-7')
    const keys = charge(null, '0.0001', '1e-7')
    expect(run(cap, new Array<Charge>(6).fill(keys)).accepted).toEqual([true, true, true, true, true, false])
    expect(accepts(capOf('4', '1e-6', '0'), nothingSpent, keys)).toBe(false)
  })

  test('holds a pure account to its epsilon', () => {
    const cap = capOf('1', '0', '0')
    expect(accepts(cap, nothingSpent, charge(null, '1e-15'))).toBe(false)
    expect(accepts(cap, nothingSpent, charge('1', '0.4621171573'))).toBe(true)
    expect(accepts(cap, nothingSpent, charge('1.000000000000000000001', '0.47'))).toBe(false)
  })

  // Unit counts that fit in (1, 1e-6) by noise of this standard deviation: independent search over the tight conversion.
  test.each([
    [5, 1],
    [10, 4],
    [20, 19],
    [50, 121],
    [100, 487],
    [200, 1948],
  ])('fits as many Gaussian counts of standard deviation %i as the conversion allows', (deviation, times) => {
    const cap = capOf('1', '1e-6', '0')
    const each = { epsilon: null, rho: Fraction.make(1n, 2n * BigInt(deviation) ** 2n), delta: Fraction.zero }
    expect(fit(cap, each, times + 1)).toBe(times)
    expect(timesLeft(cap, nothingSpent, each)).toBe(BigInt(times))
  })

  // sqrt(2)/deviation each: basic composition on the pure track or the exact rho on the other, whichever lasts longer.
  test.each([
    ['0.28284271247461900976', '0.0365', 3],
    ['0.070710678118654752440', '0.00245', 14],
  ])('fits Laplace counts of epsilon %s on the pure track', (epsilon, rho, times) => {
    expect(fit(capOf('1', '1e-6', '0'), charge(epsilon, rho), times + 1)).toBe(times)
  })
})

describe('what is left', () => {
  test('is what the rule would still accept, on the track that lasts longer and within the pot', () => {
    const cap = capOf('4', '1e-6', '5e-7')
    const charges = [charge('0.1', '0.004995'), charge(null, '0.004995'), charge('0.1', '0.004995', '1e-8'), charge(null, '0.1', '2e-7'), charge('5', '1')]
    for (const before of [nothingSpent, run(cap, [charges[0]!, charges[3]!]).spent, run(cap, [charges[3]!, charges[3]!]).spent]) {
      for (const each of charges) {
        let [count, spent] = [0n, before]
        while (accepts(cap, spent, each)) [count, spent] = [count + 1n, addCharge(spent, each)]
        expect(timesLeft(cap, before, each)).toBe(count)
      }
    }
  })

  test('reads as the lesser epsilon of the two tracks', () => {
    const cap = capOf('1', '1e-6', '0')
    const spent = run(cap, [charge('0.1', '0.0048374180359595731643')]).spent
    expect(epsilonSpent(cap, spent)?.toString()).toBe('1/10')
    expect(epsilonSpent(cap, nothingSpent)).toEqual(Fraction.zero)
    expect(epsilonSpent(capOf('1', '0', '0'), spent)?.toString()).toBe('1/10')
  })

  test('tells when a first Gaussian release would cost statements', () => {
    const laplace = { epsilon: parse('0.1'), rho: pureRho(parse('0.1')), delta: Fraction.zero }
    // Equal shares of either track: nothing is lost; a dearer Gaussian loses statements; once the pure track is closed there is nothing to lose.
    const cap = capOf('1', '1e-6', '0')
    const share = { epsilon: null, rho: statementBudget(parse('0.1'), cap).rho, delta: Fraction.zero }
    expect(gaussianCostsStatements(cap, nothingSpent, share, laplace)).toBe(false)
    expect(gaussianCostsStatements(cap, nothingSpent, { ...share, rho: laplace.rho }, laplace)).toBe(true)
    expect(gaussianCostsStatements(cap, { ...nothingSpent, epsilon: null }, { ...share, rho: laplace.rho }, laplace)).toBe(false)
    // A pure account's share of rho is gone after pure releases.
    const spent = run(cap, new Array<Charge>(5).fill(laplace)).spent
    expect(gaussianCostsStatements(cap, spent, share, laplace)).toBe(true)
  })
})
