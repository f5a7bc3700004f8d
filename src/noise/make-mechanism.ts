import { check } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'

declare const made: unique symbol

/**
 * A law of integer noise: discrete Laplace P(k) ~ exp(-|k|/scale), or discrete Gaussian P(k) ~ exp(-k²/(2 variance)), in the integer units of the total it
 * is for. INVARIANT CALIBRATED: made in noise/ only, from the sensitivity of that total; a look-alike object is turned away by `checkMade`.
 */
export type Mechanism = LaplaceMechanism | GaussianMechanism

export interface LaplaceMechanism {
  readonly kind: 'laplace'
  readonly scale: Fraction
  readonly [made]: true
}

export interface GaussianMechanism {
  readonly kind: 'gaussian'
  /** The parameter sigma² of the law; its variance is at most that. */
  readonly variance: Fraction
  readonly [made]: true
}

const all = new WeakSet<object>()

/** The discrete Laplace law of this scale, greater than 0. For calibrate.ts and tests of the laws only. */
export function makeLaplace(scale: Fraction): LaplaceMechanism {
  check(scale.isPositive(), 'a Laplace scale is greater than 0')
  return enlist({ kind: 'laplace', scale } as LaplaceMechanism)
}

/** The discrete Gaussian law of this sigma², greater than 0. For calibrate.ts and tests of the laws only. */
export function makeGaussian(variance: Fraction): GaussianMechanism {
  check(variance.isPositive(), 'a Gaussian variance is greater than 0')
  return enlist({ kind: 'gaussian', variance } as GaussianMechanism)
}

/** Holds that the mechanism was made here, whatever the types were talked into. */
export function checkMade(mechanism: Mechanism): void {
  check(all.has(mechanism), 'a mechanism is made by calibration only')
}

function enlist<M extends Mechanism>(mechanism: M): M {
  all.add(Object.freeze(mechanism))
  return mechanism
}
