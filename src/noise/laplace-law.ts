import { expInterval, lnInterval, oneMinusExpInterval, tanhInterval } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { Interval } from '../base/interval.ts'
import { bitLength } from '../base/significant.ts'

/** The discrete Laplace law in closed form, with q = e^(-1/scale): P(k) = (1-q)/(1+q) q^|k| (Ghosh, Roughgarden & Sundararajan 2012). */

const bits = 160n
const one = Interval.of(Fraction.one, bits)
const two = Interval.integer(2n, bits)
/** Above this y / sinh y is below 2^-8600: it is taken as nothing, which rounds rho up. */
const sinhLimit = Fraction.make(3000n)

/** 2q / (1-q)², rounded up. */
export function laplaceVariance(scale: Fraction): Fraction {
  const rate = Fraction.one.div(scale)
  const gap = oneMinusExpInterval(rate, bits)
  return two.mul(expInterval(rate.neg(), bits)).div(gap.mul(gap)).high
}

/** P(X >= m), rounded up: q^m / (1+q) for m >= 1. */
export function laplaceTail(scale: Fraction, m: bigint): Fraction {
  return tailInterval(scale, m).high
}

function tailInterval(scale: Fraction, m: bigint): Interval {
  if (m <= 0n) return one.sub(tailInterval(scale, 1n - m))
  return expInterval(Fraction.make(-m).div(scale), bits).div(onePlusQ(scale))
}

/** The smallest m >= 1 with P(X >= m) <= p, 0 < p, rounded up: m >= scale * ln(1 / (p (1+q))). */
export function laplaceSmallestWithTail(scale: Fraction, p: Fraction): bigint {
  const inverse = Interval.of(Fraction.one.div(p), bits).div(onePlusQ(scale))
  let m = lnInterval(inverse.high, bits).high.mul(scale).ceil()
  if (m < 1n) m = 1n
  return m > 1n && laplaceTail(scale, m - 1n).isAtMost(p) ? m - 1n : m
}

/**
 * The zCDP parameter of one draw over an integer total that one person moves by up to `each`, rounded up: x - y(1 - e^-x)/sinh(y) with y = 1/scale and
 * x = each * y, which is the divergence of the law from its shift (the exact rho of Laplace noise: Harrison & Manurangsi 2025, "Exact zCDP Characterizations
 * for Fundamental Differentially Private Mechanisms"). Never above x tanh(x/2), what any x-private mechanism costs (Bun & Steinke 2016). It is convex in
 * `each`, so twin totals that share the bound cost no more.
 */
export function laplaceRho(scale: Fraction, each: bigint): Fraction {
  const y = Fraction.one.div(scale)
  const x = y.mul(Fraction.make(each))
  const ceiling = pureRho(x)
  if (sinhLimit.isLess(y)) return ceiling
  // rho is near x y each / 2 while x is subtracted from x: the bits lost are those of 1 / x.
  const wide = bits + 2n * bitLength(x.d / x.n) + 2n * bitLength(y.d / y.n)
  const grow = expInterval(y, wide)
  const sinh = grow.sub(Interval.of(Fraction.one, wide).div(grow)).div(Interval.integer(2n, wide))
  const gained = Interval.of(y, wide).mul(oneMinusExpInterval(x, wide)).div(sinh)
  const rho = Interval.of(x, wide).sub(gained).high
  return Interval.of(rho.min(ceiling).max(Fraction.zero), bits).high
}

/** epsilon tanh(epsilon / 2), rounded up: the zCDP parameter of any epsilon-private mechanism (Bun & Steinke 2016; tight form). */
export function pureRho(epsilon: Fraction): Fraction {
  if (epsilon.isZero()) return epsilon
  return Interval.of(epsilon, bits).mul(tanhInterval(epsilon.mul(Fraction.make(1n, 2n)), bits)).high
}

function onePlusQ(scale: Fraction): Interval {
  return one.add(expInterval(Fraction.make(-1n).div(scale), bits))
}
