import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'

/** The two-sided normal quantile: the least z with P(|N| > z) <= 1 - confidence, rounded up (1.959964 for 0.95). */
export function normalQuantile(_confidence: Fraction): Fraction {
  throw new BrokenCheck('normalQuantile')
}
