import { sqrt } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { normalQuantile } from '../noise/quantile.ts'
import type { Units } from '../plan/release-plan.ts'

/** A total after noise: one number, a twin's two or a triple's three. */
export type Noisy = readonly bigint[]

/** What a released value shows. Computed from noisy totals alone: post-processing. */
export interface Shown {
  readonly text: string | null
  /** Half-width at the asked confidence, of the noise alone; null where the noisy count is too weak to say. */
  readonly margin: Fraction | null
}

export interface ShowOptions {
  readonly confidence: Fraction
  readonly nonnegative: boolean
}

/** The width of a clamp, in units. */
export function width(units: Units): Fraction {
  return Fraction.make(units.high - units.low)
}

/** The square of an exact number. */
export function square(value: Fraction): Fraction {
  return value.mul(value)
}

/** The half-width of a normal interval with that variance, at the asked confidence. */
export function ofVariance(variance: Fraction, options: ShowOptions): Fraction {
  return normalQuantile(options.confidence).mul(sqrt(variance, 'up', 64n))
}
