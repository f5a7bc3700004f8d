import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { Mechanism } from './make-mechanism.ts'

/**
 * The smallest T at which a key that one person alone owns shows with chance delta at most, over the `groups` keys they may own: a key is shown iff
 * persons + noise >= T.
 */
export function keyThreshold(_mechanism: Mechanism, _groups: bigint, _delta: Fraction): bigint {
  throw new BrokenCheck('keyThreshold')
}
