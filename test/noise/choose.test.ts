import { describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { Fraction } from '../../src/base/fraction.ts'
import { rhoOfGaussian } from '../../src/noise/calibrate.ts'
import type { Reach } from '../../src/base/reach.ts'
import { choose } from '../../src/noise/choose.ts'
import { keyThreshold, shareOfKey } from '../../src/noise/threshold.ts'
import { makeGaussian, makeLaplace } from '../../src/noise/make-mechanism.ts'
import { normalQuantile } from '../../src/noise/quantile.ts'
import { normalTail } from '../../src/noise/normal-tail.ts'

const parse = Fraction.parse
const count: Reach = { groups: 1n, each: 1n, coordinates: 1 }

describe('the choice of noise', () => {
  test('takes Laplace for one accurate count and Gaussian for many groups, and names the runner-up', () => {
    // Gaussian has the smaller variance iff groups > (epsilon sigma)²/2 at equal charge: here epsilon 1 and sigma² = 1/(2 rho).
    const budget = { epsilon: parse('1'), rho: parse('0.0243559703595') }
    const few = choose([count], budget, 'auto')
    expect(few).toMatchObject({ kind: 'laplace', charge: { epsilon: Fraction.one }, runnerUp: { kind: 'gaussian' } })
    expect(few?.mechanisms).toHaveLength(1)
    // 1.841347188415584… = 2q/(1-q)² at q = 1/e, against 1/(2 rho) = 20.53.
    expect(few?.relativeVariance.toDecimal(12, 'down')).toBe('1.841347188415')
    expect(few?.runnerUp?.relativeVariance.toDecimal(2, 'down')).toBe('20.52')
    const many = choose([{ ...count, groups: 40n }], budget, 'auto')
    expect(many).toMatchObject({ kind: 'gaussian', charge: { epsilon: null }, runnerUp: { kind: 'laplace' } })
    expect(many?.relativeVariance.isLess(many.runnerUp!.relativeVariance)).toBe(true)
  })

  test('obeys a wish, and still shows the other law', () => {
    const budget = { epsilon: parse('1'), rho: parse('0.02') }
    expect(choose([count], budget, 'gaussian')).toMatchObject({ kind: 'gaussian', runnerUp: { kind: 'laplace' } })
    expect(choose([{ ...count, groups: 40n }], budget, 'laplace')).toMatchObject({ kind: 'laplace', runnerUp: { kind: 'gaussian' } })
  })

  test('has Laplace only where there is no rho to spend', () => {
    const budget = { epsilon: parse('1'), rho: Fraction.zero }
    expect(choose([{ ...count, groups: 1000n }], budget, 'auto')).toMatchObject({ kind: 'laplace', runnerUp: null })
    expect(choose([count], budget, 'gaussian')).toBeNull()
  })

  test('splits the budget equally over the totals, so that each is as accurate beside its reach', () => {
    // Delta 1, 100, 10000 at rho 0.02: sigma 8.660254…, ·100, ·10000; at epsilon 1: variances 18·Delta² (independent arithmetic; Lagrange).
    const reaches = [1n, 100n, 10000n].map((each) => ({ groups: 1n, each, coordinates: 1 }) as const)
    const budget = { epsilon: parse('1'), rho: parse('0.02') }
    const gaussian = choose(reaches, budget, 'gaussian')
    expect(gaussian?.mechanisms.map((mechanism) => (mechanism.kind === 'gaussian' ? mechanism.variance.toString() : ''))).toEqual([
      '75',
      '750000',
      '7500000000',
    ])
    expect(gaussian?.relativeVariance).toEqual(parse('225'))
    expect(gaussian?.charge).toEqual({ epsilon: null, rho: parse('0.02') })
    const laplace = choose(reaches, budget, 'laplace')
    expect(laplace?.mechanisms.map((mechanism) => (mechanism.kind === 'laplace' ? mechanism.scale.toString() : ''))).toEqual(['3', '300', '30000'])
    expect(laplace?.relativeVariance.toApproximate()).toBeCloseTo(54 - 1 / 6, 2)
    expect(laplace?.charge.epsilon).toEqual(Fraction.one)
  })

  test('charges what the mechanisms cost, never above the budget', () => {
    const reaches: Reach[] = [
      { groups: 12n, each: 20n, coordinates: 1 },
      { groups: 12n, each: 50000n, coordinates: 2 },
      { groups: 12n, each: 0n, coordinates: 1 },
    ]
    for (const [epsilon, rho] of [
      ['0.1', '0.0024355970359538372894243245862'],
      ['1e-9', '4.99e-19'],
      ['1e30', '9.9e29'],
      ['0.333333333333333333333333333333333333333', '0.0333'],
    ] as const) {
      const budget = { epsilon: parse(epsilon), rho: parse(rho) }
      const gaussian = choose(reaches, budget, 'gaussian')
      expect(gaussian?.charge.rho.isAtMost(budget.rho)).toBe(true)
      const sum = gaussian?.mechanisms.map((mechanism, i) => {
        if (mechanism.kind !== 'gaussian') throw new Error('another law')
        const each = reaches[i]!.each === 0n ? 1n : reaches[i]!.each
        return rhoOfGaussian(mechanism, 12n * each * each)
      })
      expect(sum?.reduce((a, b) => a.add(b))).toEqual(gaussian?.charge.rho)
      const laplace = choose(reaches, budget, 'laplace')
      expect(laplace?.charge.epsilon?.isAtMost(budget.epsilon)).toBe(true)
      expect(budget.epsilon.isAtMost(laplace!.charge.epsilon!.mul(parse('1.00000001')))).toBe(true)
    }
  })

  test('spends rho on Laplace noise once the pure track is closed', () => {
    const choice = choose([count], { epsilon: null, rho: parse('0.01') }, 'laplace')
    expect(choice?.charge.rho.isAtMost(parse('0.01'))).toBe(true)
    expect(choice?.charge.rho.toApproximate()).toBeCloseTo(0.01, 6)
    // At equal rho Gaussian noise has the smaller variance below rho 1.63 a number.
    expect(choose([count], { epsilon: null, rho: parse('0.01') }, 'auto')?.kind).toBe('gaussian')
  })

  test('finds no law where the pure track is closed and there is no rho either', () => {
    for (const wish of ['auto', 'laplace', 'gaussian'] as const) expect(choose([count], { epsilon: null, rho: Fraction.zero }, wish)).toBeNull()
  })

  test('needs totals and a budget', () => {
    expect(() => choose([], { epsilon: parse('1'), rho: parse('1') }, 'auto')).toThrow(BrokenCheck)
    expect(() => choose([count], { epsilon: Fraction.zero, rho: parse('1') }, 'auto')).toThrow(BrokenCheck)
  })
})

describe('the threshold of a key', () => {
  // Smallest T with P(1 + X >= T) <= 1 - (1 - delta)^(1/L): independent direct tail sums over the law of Canonne, Kamath & Steinke 2020.
  test.each([
    ['25', 1n, '1e-8', 30n],
    ['25', 4n, '1e-8', 31n],
    ['25', 10n, '1e-9', 34n],
    ['50', 1n, '1e-8', 42n],
    ['50', 4n, '1e-8', 43n],
    ['50', 10n, '1e-9', 47n],
    ['100', 1n, '1e-8', 58n],
    ['100', 4n, '1e-8', 60n],
    ['100', 10n, '1e-9', 66n],
    ['400', 1n, '1e-8', 114n],
    ['400', 4n, '1e-8', 119n],
    ['400', 10n, '1e-9', 129n],
  ])('is what direct sums give for Gaussian noise of variance %s over %s keys at delta %s', (variance, groups, delta, threshold) => {
    expect(keyThreshold(makeGaussian(parse(variance)), groups, parse(delta))).toBe(threshold)
  })

  // q^(T-1)/(1+q) <= 1 - (1 - delta)^(1/L), q = e^(-epsilon/L): independent 60-digit arithmetic.
  test.each([
    ['1', 1n, '1e-6', 15n],
    ['1', 2n, '1e-6', 30n],
    ['1', 4n, '1e-6', 60n],
    ['1', 10n, '1e-6', 156n],
    ['1', 100n, '1e-6', 1775n],
    ['0.5', 1n, '1e-6', 28n],
    ['0.5', 4n, '1e-6', 118n],
    ['0.5', 100n, '1e-6', 3548n],
    ['0.1', 1n, '1e-8', 179n],
    ['0.1', 10n, '1e-8', 2005n],
    ['0.1', 100n, '1e-8', 22335n],
  ])('is the closed form for Laplace noise of epsilon %s over %s keys at delta %s', (epsilon, groups, delta, threshold) => {
    expect(keyThreshold(makeLaplace(Fraction.make(groups).div(parse(epsilon))), groups, parse(delta))).toBe(threshold)
  })

  test('shares delta over the keys exactly, rounded down', () => {
    // 2.500000937500546875375977e-7 = 1 - (1 - 1e-6)^(1/4), independent 60-digit arithmetic.
    const share = shareOfKey(4n, parse('1e-6'))
    expect(share.toDecimal(31, 'nearest')).toBe('0.0000002500000937500546875375977')
    let kept = Fraction.one
    for (let i = 0; i < 4; i++) kept = kept.mul(Fraction.one.sub(share))
    expect(Fraction.one.sub(kept).isAtMost(parse('1e-6'))).toBe(true)
    expect(shareOfKey(1000n, parse('1e-30')).toDecimal(60, 'nearest')).toMatch(/^0\.0{32}1000000000000000000000000000/)
  })

  test('shows every key where the budget is without measure', () => {
    expect(keyThreshold(makeGaussian(parse('1e-30')), 12n, parse('1e-8'))).toBe(2n)
  })
})

describe('the normal quantile', () => {
  // Independent 60-digit arithmetic: z at two-sided confidence.
  test.each([
    ['0.9', '1.6448536269514727148638489079916321'],
    ['0.95', '1.9599639845400542355245944305205515'],
    ['0.99', '2.5758293035489007609785767486038141'],
  ])('at %s is z, rounded up by 1e-13 at most', (confidence, z) => {
    const quantile = normalQuantile(parse(confidence))
    expect(parse(z).isAtMost(quantile)).toBe(true)
    expect(quantile.isAtMost(parse(z).add(parse('1e-13')))).toBe(true)
  })

  test('starts at 0 and reaches far tails', () => {
    expect(normalQuantile(Fraction.zero)).toEqual(Fraction.zero)
    const far = normalQuantile(Fraction.one.sub(parse('2e-20')))
    // P(N >= 9.262340089798408) = 1e-20.
    expect(far.toDecimal(9, 'nearest')).toBe('9.262340090')
  })

  test('stands on enclosed tails: the halves meet, and Mills takes over where the series ends', () => {
    const sum = normalTail(parse('1.5'), 100n).high.add(normalTail(parse('-1.5'), 100n).high)
    expect(Fraction.one.isAtMost(sum) && sum.isAtMost(parse('1.00000000000000000000000001'))).toBe(true)
    const [near, beyond] = [normalTail(parse('40'), 80n), normalTail(parse('40.000000000001'), 80n)]
    expect(beyond.low.isAtMost(near.high) && near.low.isAtMost(beyond.high)).toBe(true)
  })
})
