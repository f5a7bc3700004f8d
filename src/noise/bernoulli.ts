import { check } from '../base/check.ts'
import type { BitSource } from './bits.ts'

/** True with chance exactly n / d, 0 <= n <= d. */
export function bernoulli(n: bigint, d: bigint, bits: BitSource): boolean {
  check(0n <= n && n <= d && d > 0n, 'a chance lies between 0 and 1')
  return bits.below(d) < n
}

/**
 * True with chance exactly e^-g for g = n / d >= 0 (Canonne, Kamath & Steinke 2020, "The Discrete Gaussian for Differential Privacy", section 5): within
 * [0, 1] the number of successes of trials with chances g/1, g/2, g/3, … is even; a larger g is a product of whole steps and its rest.
 */
export function bernoulliExp(n: bigint, d: bigint, bits: BitSource): boolean {
  check(n >= 0n && d > 0n, 'e^-g is drawn for g of at least 0')
  for (let whole = n / d; whole > 0n; whole--) {
    if (!bernoulliExpWithinOne(1n, 1n, bits)) return false
  }
  return bernoulliExpWithinOne(n % d, d, bits)
}

function bernoulliExpWithinOne(n: bigint, d: bigint, bits: BitSource): boolean {
  let k = 1n
  while (bernoulli(n, d * k, bits)) k++
  return (k & 1n) === 1n
}
