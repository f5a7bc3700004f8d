import { check } from './check.ts'
import { fixedLn2, fixedPi } from './constants.ts'
import { Fraction } from './fraction.ts'
import { Interval } from './interval.ts'
import { bitLength, integerSquareRoot } from './significant.ts'

/** Which end of the enclosure a caller wants: the result is never on the wrong side of the true value. */
type Side = 'up' | 'down'

/** e^x is not told from 0 below the lower end, where it is enclosed in [0, 2^-2016]; above the upper end it is not asked for. */
const leastExponent = -1400n
const greatestExponent = 6000n
const least = Fraction.make(1n, 1n << 2016n)

/** e^x; relative width below 2^-bits. A BrokenCheck for x > 6000. */
export function expInterval(x: Fraction, bits: bigint): Interval {
  if (x.isZero()) return Interval.of(Fraction.one, bits)
  if (x.n < leastExponent * x.d) return Interval.between(Fraction.zero, least, bits)
  check(x.n <= greatestExponent * x.d, 'e^x is asked for within range')
  const p = bits + 32n
  const fixed = (x.n << p) / x.d
  const ln2 = fixedLn2(p)
  const k = fixed / ln2
  const value = fixedExp(fixed - k * ln2, p)
  // The argument is off by 2|k| + 2 <= 2^15 units, the series by less than 2^17 after its eight squarings.
  const slack = 1n << 19n
  return Interval.between(scaled(value - slack, k - p), scaled(value + slack, k - p), bits)
}

/** e^r * 2^p for |r| < 1 in fixed point: r is halved eight times, the series summed, the sum squared eight times. */
function fixedExp(r: bigint, p: bigint): bigint {
  const wide = p + 8n
  let sum = 1n << wide
  let term = sum
  for (let i = 1n; term !== 0n && term !== -1n; i++) {
    term = ((term * r) >> wide) / i
    sum += term
  }
  for (let i = 0; i < 8; i++) sum = (sum * sum) >> wide
  return sum >> 8n
}

/** ln x for x > 0; absolute width below 2^-bits * (1 + |ln x|). */
export function lnInterval(x: Fraction, bits: bigint): Interval {
  check(x.isPositive(), 'ln needs a positive value')
  const p = bits + 32n
  const k = bitLength(x.n) - bitLength(x.d)
  // x / 2^k lies in (1/2, 2), so z = (m - 1) / (m + 1) lies within 1/3.
  const [n, d] = k >= 0n ? [x.n, x.d << k] : [x.n << -k, x.d]
  const z = ((n - d) << p) / (n + d)
  const square = (z * z) >> p
  let power = z
  let sum = 0n
  for (let i = 1n; power !== 0n && power !== -1n; i += 2n) {
    sum += power / i
    power = (power * square) >> p
  }
  const value = 2n * sum + k * fixedLn2(p)
  const slack = (1n << 14n) + 2n * (k < 0n ? -k : k)
  return Interval.between(scaled(value - slack, -p), scaled(value + slack, -p), bits + bitLength(k < 0n ? -k : k))
}

/** The square root of x >= 0; relative width below 2^-bits, and exact where it is rational on the grid. */
export function sqrtInterval(x: Fraction, bits: bigint): Interval {
  check(x.n >= 0n, 'a square root needs a non-negative value')
  if (x.isZero()) return Interval.of(x, bits)
  const half = bits + 2n + ((bitLength(x.d) - bitLength(x.n)) >> 1n) + 1n
  const shift = 2n * half
  const [n, d] = shift >= 0n ? [x.n << shift, x.d] : [x.n, x.d << -shift]
  const root = integerSquareRoot(n / d)
  const exact = root * root * d === n
  return Interval.between(scaled(root, -half), scaled(exact ? root : root + 1n, -half), bits)
}

/** 1 - e^-x for x > 0; relative width below 2^-bits also for small x. */
export function oneMinusExpInterval(x: Fraction, bits: bigint): Interval {
  check(x.isPositive(), '1 - e^-x is asked for at a positive value')
  const lost = bitLength(x.d / x.n)
  const wide = bits + lost + 3n
  const power = expInterval(x.neg(), wide)
  return Interval.between(Fraction.one.sub(power.high), Fraction.one.sub(power.low), bits)
}

/** tanh x for x >= 0; relative width below 2^-bits. */
export function tanhInterval(x: Fraction, bits: bigint): Interval {
  if (x.isZero()) return Interval.of(x, bits)
  const twice = x.add(x)
  const above = oneMinusExpInterval(twice, bits + 4n)
  const below = Interval.of(Fraction.one, bits + 4n).add(expInterval(twice.neg(), bits + 4n))
  const ratio = above.div(below)
  return Interval.between(ratio.low, ratio.high.min(Fraction.one), bits)
}

/** pi; relative width below 2^-bits. */
export function piInterval(bits: bigint): Interval {
  const p = bits + 8n
  const value = fixedPi(p)
  return Interval.between(scaled(value - 2n, -p), scaled(value + 2n, -p), bits)
}

/** e^x rounded to the named side, within 2^-bits relative (bits 200: 60 decimal digits). */
export function exp(x: Fraction, side: Side, bits = 200n): Fraction {
  return expInterval(x, bits).end(side)
}

/** ln x rounded to the named side, within 2^-bits * (1 + |ln x|). */
export function ln(x: Fraction, side: Side, bits = 200n): Fraction {
  return lnInterval(x, bits).end(side)
}

/** tanh x, x >= 0, rounded to the named side, within 2^-bits relative. */
export function tanh(x: Fraction, side: Side, bits = 200n): Fraction {
  return tanhInterval(x, bits).end(side)
}

/** The square root of x >= 0 rounded to the named side, within 2^-bits relative. */
export function sqrt(x: Fraction, side: Side, bits = 200n): Fraction {
  return sqrtInterval(x, bits).end(side)
}

/** value * 2^power. */
function scaled(value: bigint, power: bigint): Fraction {
  return power >= 0n ? Fraction.make(value << power) : Fraction.make(value, 1n << -power)
}
