import { expInterval, piInterval, sqrtInterval } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { Interval } from '../base/interval.ts'
import { normalTail } from './normal-tail.ts'

/**
 * The discrete Gaussian law P(k) = e^(-k²/2v) / Z over the integers (Canonne, Kamath & Steinke 2020), summed where sums are short, bounded where they
 * are long.
 */

const bits = 160n
const one = Interval.of(Fraction.one, bits)
const two = Interval.integer(2n, bits)
const half = Fraction.make(1n, 2n)
/** Tails are summed up to this parameter. */
const summedUpTo = Fraction.make(400n)
/** From here on Poisson summation gives Z = sqrt(2 pi v) (1 + d), 0 < d < 2^-112, and the variance v(1 - d'), 0 < d' < 1e-31. */
const smoothFrom = Fraction.make(4n)
const smoothDefect = Fraction.make(1n, 1n << 112n)
const negligible = Fraction.make(1n, 1n << 80n)

/** The variance, rounded up; never above v. */
export function gaussianVariance(v: Fraction): Fraction {
  if (smoothFrom.isAtMost(v)) return v
  const step = expInterval(half.div(v).neg(), bits)
  const squared = step.mul(step)
  let [power, odd, sum] = [step, step.mul(squared), Interval.of(Fraction.zero, bits)]
  // power = step^(k²), odd = step^(2k+1). For v < 4 each term past k = 7 is below half of the one before, so the rest is at most the last one summed.
  let last = power
  for (let k = 1n; k < 8n || negligible.mul(sum.high).isLess(last.high); k++) {
    last = power.mul(Interval.integer(k * k, bits))
    sum = sum.add(last)
    if (sum.low.isZero()) break
    power = power.mul(odd)
    odd = odd.mul(squared)
  }
  const top = two.mul(Interval.between(sum.low, sum.high.add(last.high), bits))
  return top.div(normaliser(v)).high.min(v)
}

/** P(X >= m), rounded up; below 1 it is what the other side leaves. */
export function gaussianTail(v: Fraction, m: bigint): Fraction {
  if (m <= 0n) return Fraction.one.sub(tailFromBelow(v, 1n - m))
  return v.isAtMost(summedUpTo) ? sumFrom(v, m).div(normaliser(v)).high : boundedTail(v, m)
}

/** P(X >= m) for m >= 1, rounded down: where it is not summed, the terms are at least the integral from m on. */
function tailFromBelow(v: Fraction, m: bigint): Fraction {
  if (v.isAtMost(summedUpTo)) return sumFrom(v, m).div(normaliser(v)).low
  const x = Interval.of(Fraction.make(m).div(sqrtInterval(v, bits).low), 64n).high
  return normalTail(x, 64n).low.div(Fraction.one.add(smoothDefect))
}

/** The smallest m >= 1 with P(X >= m) <= p, 0 < p, by what gaussianTail proves. */
export function gaussianSmallestWithTail(v: Fraction, p: Fraction): bigint {
  const holds = (m: bigint) => gaussianTail(v, m).isAtMost(p)
  let [low, high] = [0n, 1n]
  while (!holds(high)) [low, high] = [high, 2n * high]
  while (high - low > 1n) {
    const middle = (low + high) >> 1n
    if (holds(middle)) high = middle
    else low = middle
  }
  return high
}

/**
 * Where sums are long: f(k) = e^(-k²/2v) is convex beyond sigma, so each term is at most the integral over [k - 1/2, k + 1/2] (Hermite-Hadamard). Below
 * sigma the midpoint rule errs by at most 1/8 of the integral of |f''| (the greatest value of its Peano kernel), which is at most 2 e^(-1/2) / sigma;
 * divided by Z > sigma sqrt(2 pi) that is less than 1/(16 v).
 */
function boundedTail(v: Fraction, m: bigint): Fraction {
  const edge = Fraction.make(2n * m - 1n, 2n)
  const sigma = sqrtInterval(v, bits)
  const x = Interval.of(edge.div(sigma.high), 64n).low
  const tail = normalTail(x, 64n).high
  return v.isAtMost(edge.mul(edge)) ? tail : tail.add(Fraction.one.div(v.mul(Fraction.make(16n))))
}

/** Z = 1 + 2 (e^(-1/2v) + e^(-4/2v) + …). */
function normaliser(v: Fraction): Interval {
  if (v.isLess(smoothFrom)) return one.add(two.mul(sumFrom(v, 1n)))
  const square = piInterval(bits).mul(Interval.of(v.add(v), bits))
  const smooth = Interval.between(sqrtInterval(square.low, bits).low, sqrtInterval(square.high, bits).high, bits)
  return Interval.between(smooth.low, smooth.high.mul(Fraction.one.add(smoothDefect)), bits)
}

/** The sum of e^(-k²/2v) over k >= m >= 1: the first term in full, the others relative to it in fixed point, rounded both ways. */
function sumFrom(v: Fraction, m: bigint): Interval {
  const first = expInterval(
    Fraction.make(m * m)
      .div(v)
      .mul(half)
      .neg(),
    bits,
  )
  const ratio = expInterval(
    Fraction.make(2n * m + 1n)
      .div(v)
      .mul(half)
      .neg(),
    bits,
  )
  const step = expInterval(Fraction.one.div(v).neg(), bits)
  const [unit, p] = [1n << bits, bits]
  const down = (x: Fraction) => (x.n * unit) / x.d
  const [lowStep, highStep] = [down(step.low), down(step.high) + 1n]
  let [lowRatio, highRatio] = [down(ratio.low), down(ratio.high) + 1n]
  let [low, high, lowSum, highSum] = [unit, unit, unit, unit]
  // highRatio settles at a few units, so the terms die out; past half the rest is at most the last term, and ratios only fall.
  while (high > 64n || 2n * highRatio > unit) {
    low = (low * lowRatio) >> p
    high = ((high * highRatio) >> p) + 1n
    lowSum += low
    highSum += high
    lowRatio = (lowRatio * lowStep) >> p
    highRatio = ((highRatio * highStep) >> p) + 1n
  }
  return first.mul(Interval.between(Fraction.make(lowSum, unit), Fraction.make(highSum + high, unit), bits))
}
