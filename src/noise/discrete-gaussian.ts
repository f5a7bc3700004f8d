import type { Fraction } from '../base/fraction.ts'
import { integerSquareRoot } from '../base/significant.ts'
import { bernoulliExp } from './bernoulli.ts'
import type { BitSource } from './bits.ts'
import { drawDiscreteLaplaceOf } from './discrete-laplace.ts'

/**
 * One exact draw with P(k) proportional to exp(-k² / (2 variance)), variance > 0 (Canonne, Kamath & Steinke 2020, algorithm 3): Y from the discrete Laplace law
 * of scale t = floor(sigma) + 1, kept with chance exp(-(|Y| - variance/t)² / (2 variance)).
 */
export function drawDiscreteGaussian(variance: Fraction, bits: BitSource): bigint {
  const { n, d } = variance
  const t = integerSquareRoot(n / d) + 1n
  for (;;) {
    const y = drawDiscreteLaplaceOf(t, 1n, bits)
    // (|y| - n/(d t))² / (2 n/d) = (|y| d t - n)² / (2 n d t²)
    const gap = (y < 0n ? -y : y) * d * t - n
    if (bernoulliExp(gap * gap, 2n * n * d * t * t, bits)) return y
  }
}
