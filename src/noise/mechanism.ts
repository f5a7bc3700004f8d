import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { BitSource } from './bits.ts'
import type { Mechanism } from './make-mechanism.ts'

/** One draw of the noise, exact. */
export function draw(_mechanism: Mechanism, _bits: BitSource): bigint {
  throw new BrokenCheck('draw')
}
/** The variance of the noise, rounded up. */
export function varianceOf(_mechanism: Mechanism): Fraction {
  throw new BrokenCheck('varianceOf')
}
/** The smallest m with P(|X| > m) <= 1 - confidence, rounded up. */
export function margin(_mechanism: Mechanism, _confidence: Fraction): bigint {
  throw new BrokenCheck('margin')
}
/** P(X >= m), rounded up. */
export function tailAtLeast(_mechanism: Mechanism, _m: bigint): Fraction {
  throw new BrokenCheck('tailAtLeast')
}
/** P(X != 0), rounded up. */
export function probabilityNonzero(_mechanism: Mechanism): Fraction {
  throw new BrokenCheck('probabilityNonzero')
}
