import { check, unreachable } from '../base/check.ts'
import { Fraction } from '../base/fraction.ts'
import type { BitSource } from './bits.ts'
import { drawDiscreteGaussian } from './discrete-gaussian.ts'
import { drawDiscreteLaplace } from './discrete-laplace.ts'
import { gaussianSmallestWithTail, gaussianTail, gaussianVariance } from './gaussian-law.ts'
import { laplaceSmallestWithTail, laplaceTail, laplaceVariance } from './laplace-law.ts'
import { checkMade, type Mechanism } from './make-mechanism.ts'

/** One draw of the noise, exact, in the total's integer units. A BrokenCheck for a mechanism that was not made by calibration (by INVARIANT CALIBRATED). */
export function draw(mechanism: Mechanism, bits: BitSource): bigint {
  checkMade(mechanism)
  switch (mechanism.kind) {
    case 'laplace':
      return drawDiscreteLaplace(mechanism.scale, bits)
    case 'gaussian':
      return drawDiscreteGaussian(mechanism.variance, bits)
    default:
      return unreachable(mechanism)
  }
}

/** The variance of the noise in square units, rounded up by at most 1e-12 of it. */
export function varianceOf(mechanism: Mechanism): Fraction {
  switch (mechanism.kind) {
    case 'laplace':
      return laplaceVariance(mechanism.scale)
    case 'gaussian':
      return gaussianVariance(mechanism.variance)
    default:
      return unreachable(mechanism)
  }
}

/** P(X >= m), rounded up. */
export function tailAtLeast(mechanism: Mechanism, m: bigint): Fraction {
  switch (mechanism.kind) {
    case 'laplace':
      return laplaceTail(mechanism.scale, m)
    case 'gaussian':
      return gaussianTail(mechanism.variance, m)
    default:
      return unreachable(mechanism)
  }
}

/** The smallest m >= 1 with P(X >= m) <= p, p > 0, never too small. */
export function smallestWithTail(mechanism: Mechanism, p: Fraction): bigint {
  check(p.isPositive(), 'a tail is greater than 0')
  switch (mechanism.kind) {
    case 'laplace':
      return laplaceSmallestWithTail(mechanism.scale, p)
    case 'gaussian':
      return gaussianSmallestWithTail(mechanism.variance, p)
    default:
      return unreachable(mechanism)
  }
}

/** The half-width of the noise at a confidence, 0 <= confidence < 1: the smallest m >= 0 with P(|X| > m) <= 1 - confidence, never too small. */
export function margin(mechanism: Mechanism, confidence: Fraction): bigint {
  check(confidence.n >= 0n && confidence.isLess(Fraction.one), 'a confidence lies between 0 and 1')
  return smallestWithTail(mechanism, Fraction.one.sub(confidence).mul(Fraction.make(1n, 2n))) - 1n
}

/** P(X != 0), rounded up: 0 in effect where the budget is so large that no noise is left. */
export function probabilityNonzero(mechanism: Mechanism): Fraction {
  const bothSides = tailAtLeast(mechanism, 1n)
  return bothSides.add(bothSides).min(Fraction.one)
}
