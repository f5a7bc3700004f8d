import { check } from '../base/check.ts'
import { Fraction } from '../base/fraction.ts'
import { remember } from '../base/remember.ts'
import { normalTail } from './normal-tail.ts'

/** The quantile is rounded up to this grid. */
const gridBits = 44n
const workBits = 96n
const kept = remember<Fraction>(256)

/** The two-sided normal quantile, 0 <= confidence < 1: the least z with P(|N| > z) <= 1 - confidence, rounded up by at most 1e-13 (1.95996… for 0.95). */
export function normalQuantile(confidence: Fraction): Fraction {
  check(confidence.n >= 0n && confidence.isLess(Fraction.one), 'a confidence lies between 0 and 1')
  return kept(confidence.toString(), () => upperQuantile(Fraction.one.sub(confidence).mul(Fraction.make(1n, 2n))))
}

/** The least z >= 0 on the grid whose upper tail, rounded up, is at most p. */
function upperQuantile(p: Fraction): Fraction {
  const at = (i: bigint) => Fraction.make(i, 1n << gridBits)
  const holds = (i: bigint) => normalTail(at(i), workBits).high.isAtMost(p)
  if (p.equals(Fraction.make(1n, 2n))) return Fraction.zero
  let [low, high] = [0n, 1n << gridBits]
  while (!holds(high)) [low, high] = [high, 2n * high]
  while (high - low > 1n) {
    const middle = (low + high) >> 1n
    if (holds(middle)) high = middle
    else low = middle
  }
  return at(high)
}
