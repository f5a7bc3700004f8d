import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'

/** The least delta at which rho-zCDP gives (epsilon, delta)-privacy, rounded up. */
export function deltaOf(_rho: Fraction, _epsilon: Fraction): Fraction {
  throw new BrokenCheck('deltaOf')
}
/** The largest rho that gives (epsilon, delta)-privacy, rounded down. */
export function rhoCap(_epsilon: Fraction, _delta: Fraction): Fraction {
  throw new BrokenCheck('rhoCap')
}
/** The least epsilon at which rho-zCDP gives (epsilon, delta)-privacy, rounded up. */
export function epsilonOf(_rho: Fraction, _delta: Fraction): Fraction {
  throw new BrokenCheck('epsilonOf')
}
