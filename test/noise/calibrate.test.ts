import { describe, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { epsilonOfLaplace, gaussianFor, laplaceFor, laplaceForRho, rhoOfGaussian, rhoOfLaplace } from '../../src/noise/calibrate.ts'
import { pureRho } from '../../src/noise/laplace-law.ts'
import { varianceOf } from '../../src/noise/mechanism.ts'

const parse = Fraction.parse
const slack = parse('1.000000001')

describe('calibration', () => {
  test.each([
    ['1', '0.125', '4'],
    ['1', '0.02', '25'],
    ['10', '0.00125', '4000'],
    ['7', '0.3', '35/3'],
  ])('gives l2² %s at rho %s the variance %s', (l2Squared, rho, variance) => {
    const mechanism = gaussianFor({ l2Squared: BigInt(l2Squared), rho: parse(rho) })
    expect(mechanism.variance.toString()).toBe(variance)
    expect(rhoOfGaussian(mechanism, BigInt(l2Squared))).toEqual(parse(rho))
  })

  test('rounds long parameters against the analyst, by little, to short ones', () => {
    const rho = parse('0.024355970359538372894243245862319880123456789')
    const gaussian = gaussianFor({ l2Squared: 12n * 2500n ** 2n, rho })
    expect(gaussian.variance.toString().length).toBeLessThan(25)
    const cost = rhoOfGaussian(gaussian, 12n * 2500n ** 2n)
    expect(cost.isAtMost(rho)).toBe(true)
    expect(rho.isAtMost(cost.mul(slack))).toBe(true)

    const epsilon = parse('0.1234567890123456789012345678901234567890123')
    const laplace = laplaceFor({ l1: 240n, epsilon })
    const spent = epsilonOfLaplace(laplace, 12n, 20n)
    expect(laplace.scale.toString().length).toBeLessThan(25)
    expect(spent.isAtMost(epsilon)).toBe(true)
    expect(epsilon.isAtMost(spent.mul(slack))).toBe(true)
  })

  // Independent 60-digit arithmetic: eps tanh(eps/2) for d = 1; eps - (eps/d)(1 - e^-eps)/sinh(eps/d) for d = 2 (after Harrison & Manurangsi 2025).
  test.each([
    ['1', 1n, '0.46211715726000975850231848364367255'],
    ['0.5', 1n, '0.12245933120185456463890056574550848'],
    ['0.1', 1n, '0.004995837495787997219838636520828432'],
    ['1', 2n, '0.39346934028736657639620046500881955'],
  ])('charges Laplace noise of epsilon %s over steps of %s its exact rho, rounded up', (epsilon, each, rho) => {
    const cost = rhoOfLaplace(laplaceFor({ l1: each, epsilon: parse(epsilon) }), 1n, each)
    expect(parse(rho).mul(parse('0.99999999999999999999999999999999')).isAtMost(cost)).toBe(true)
    expect(cost.isAtMost(parse(rho).mul(parse('1.0000000000000000000000000000001')))).toBe(true)
  })

  test('approaches epsilon + e^-epsilon - 1, the rho of continuous Laplace noise, on a fine grid, from above', () => {
    // 0.0048374180359595731642490594464366212 at 0.1.
    const cost = rhoOfLaplace(laplaceFor({ l1: 10n ** 9n, epsilon: parse('0.1') }), 1n, 10n ** 9n)
    expect(cost.toDecimal(18, 'down')).toBe('0.004837418035959573')
    expect(parse('0.0048374180359595731642490594464366212').isLess(cost)).toBe(true)
  })

  test('never charges above epsilon tanh(epsilon/2), nor above epsilon²/2, from 1e-9 to 1e30', () => {
    for (const epsilon of ['1e-9', '1e-3', '0.5', '1', '10', '1e4', '1e15', '1e30']) {
      for (const [groups, each] of [
        [1n, 1n],
        [12n, 1n],
        [1n, 2500n],
        [12n, 2500n],
      ] as const) {
        const mechanism = laplaceFor({ l1: groups * each, epsilon: parse(epsilon) })
        const [cost, pure] = [rhoOfLaplace(mechanism, groups, each), epsilonOfLaplace(mechanism, groups, each)]
        expect(cost.isPositive()).toBe(true)
        expect(cost.isAtMost(pureRho(pure))).toBe(true)
        expect(cost.isAtMost(pure.mul(pure).mul(Fraction.make(1n, 2n)))).toBe(true)
        // Convexity: the same l1 in one coordinate costs at least as much.
        expect(cost.isAtMost(rhoOfLaplace(mechanism, 1n, groups * each).mul(slack))).toBe(true)
      }
    }
    expect(rhoOfLaplace(laplaceFor({ l1: 1n, epsilon: parse('1e-9') }), 1n, 1n).toDecimal(30, 'nearest')).toBe('0.000000000000000000500000000000')
  })

  test('finds the Laplace scale that a rho buys once the pure track is closed', () => {
    for (const [groups, each, rho] of [
      [1n, 1n, '0.005'],
      [12n, 20n, '0.3'],
      [1n, 1n, '5'],
      [1n, 1n, '1e30'],
    ] as const) {
      const mechanism = laplaceForRho({ groups, each, rho: parse(rho) })
      const cost = rhoOfLaplace(mechanism, groups, each)
      expect(cost.isAtMost(parse(rho))).toBe(true)
      expect(parse(rho).isAtMost(cost.mul(parse('1.00001')))).toBe(true)
    }
    // epsilon 0.1 costs 0.004995837…: its scale comes back.
    expect(laplaceForRho({ groups: 1n, each: 1n, rho: parse('0.0049958374957879972') }).scale.toApproximate()).toBeCloseTo(10, 4)
  })

  test('leaves all but no noise at epsilon 1e30, and all but endless noise at 1e-9', () => {
    expect(varianceOf(laplaceFor({ l1: 1n, epsilon: parse('1e30') })).isLess(parse('1e-100'))).toBe(true)
    expect(varianceOf(gaussianFor({ l2Squared: 1n, rho: parse('1e30') })).isLess(parse('1e-100'))).toBe(true)
    expect(varianceOf(laplaceFor({ l1: 1n, epsilon: parse('1e-9') })).toApproximate()).toBeCloseTo(2e18, -8)
  })
})
