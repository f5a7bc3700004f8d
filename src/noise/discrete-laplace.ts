import type { Fraction } from '../base/fraction.ts'
import { bernoulliExp } from './bernoulli.ts'
import type { BitSource } from './bits.ts'

/**
 * One exact draw with P(k) proportional to exp(-|k| / scale), scale = s/r > 0 (Canonne, Kamath & Steinke 2020, algorithm 2): U on [0, s) kept with chance
 * e^(-U/s), V a count of e^-1 successes, the size floor((U + sV) / r), a fair sign, and (-, 0) drawn again so that 0 is not counted twice.
 */
export function drawDiscreteLaplace(scale: Fraction, bits: BitSource): bigint {
  return drawDiscreteLaplaceOf(scale.n, scale.d, bits)
}

/** drawDiscreteLaplace for the scale s/r given by its parts. */
export function drawDiscreteLaplaceOf(s: bigint, r: bigint, bits: BitSource): bigint {
  for (;;) {
    const u = bits.below(s)
    if (!bernoulliExp(u, s, bits)) continue
    let v = 0n
    while (bernoulliExp(1n, 1n, bits)) v++
    const size = (u + s * v) / r
    const negative = bits.below(2n) === 1n
    if (negative && size === 0n) continue
    return negative ? -size : size
  }
}
