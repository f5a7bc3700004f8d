import { check } from '../base/check.ts'
import { expInterval, lnInterval } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import type { Mechanism } from './make-mechanism.ts'
import { smallestWithTail } from './mechanism.ts'

const bits = 160n

/**
 * The smallest T at which the keys that one person alone owns, `groups` of them at the most, show with a chance of delta at most, 0 < delta < 1: a key shows
 * iff its noisy number of persons is at least T. `mechanism` is that of the person count. The chances are independent, so each key may have
 * 1 - (1 - delta)^(1/groups), rounded down here.
 */
export function keyThreshold(mechanism: Mechanism, groups: bigint, delta: Fraction): bigint {
  check(groups > 0n && delta.isPositive() && delta.isLess(Fraction.one), 'a key selection has groups and a delta')
  return smallestWithTail(mechanism, shareOfKey(groups, delta)) + 1n
}

/** 1 - (1 - delta)^(1/groups), rounded down. */
export function shareOfKey(groups: bigint, delta: Fraction): Fraction {
  if (groups === 1n) return delta
  // Both delta and its share vanish beside 1: as many more bits are carried as they are small.
  const wide = bits + 2n * BigInt((delta.d * groups).toString(16).length) * 4n
  const root = lnInterval(Fraction.one.sub(delta), wide).high.div(Fraction.make(groups))
  return Fraction.one.sub(expInterval(root, wide).high)
}
