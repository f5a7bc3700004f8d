import { check } from '../base/check.ts'
import { expInterval, lnInterval } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { Interval } from '../base/interval.ts'
import { remember } from '../base/remember.ts'
import { bitLength } from '../base/significant.ts'

/**
 * Between rho-zCDP and (epsilon, delta)-privacy, by the tight conversion of Canonne, Kamath & Steinke 2020 ("The Discrete Gaussian for Differential Privacy",
 * proposition 12): for every order 1 + b, b > 0,
 *   ln delta = b((1+b) rho - epsilon) + b ln b - (1+b) ln(1+b)
 * is sound. So every b gives a sound delta, rho or epsilon, rounded to the safe side; a search finds a b so near the best one that
 * 20 digits stay.
 */

/** Steps of the search within one factor of 2: the result is flat at the best b, so an error of 2^-44 costs about 2^-80 of it. */
const steps = 44
const searchBits = 96n
const resultBits = 120n
/** b is sought within 2^-exponentCeiling and 2^exponentCeiling. */
const exponentCeiling = 2000n

const keptDelta = remember<Fraction>(256)
const keptRho = remember<Fraction>(256)
const keptEpsilon = remember<Fraction>(256)

/** The least delta at which rho-zCDP gives (epsilon, delta)-privacy, rounded up; at most 1. rho >= 0, epsilon >= 0. */
export function deltaOf(rho: Fraction, epsilon: Fraction): Fraction {
  check(rho.n >= 0n && epsilon.n >= 0n, 'rho and epsilon are not negative')
  if (rho.isZero()) return rho
  return keptDelta(`${rho.toString()} ${epsilon.toString()}`, () => computeDelta(rho, epsilon))
}

function computeDelta(rho: Fraction, epsilon: Fraction): Fraction {
  // The derivative (1 + 2b) rho - epsilon + ln(b / (1+b)) rises with b.
  const b = leastWhere((x, bits) => {
    const slope = Interval.of(one.add(x).add(x).mul(rho).sub(epsilon), bits).add(lnInterval(x.div(one.add(x)), bits))
    return slope.low.isPositive()
  })
  if (b === null) return one
  const bits = workBits(b, epsilon.add(rho.mul(one.add(b))))
  const exponent = Interval.of(b.mul(one.add(b).mul(rho).sub(epsilon)), bits).add(entropy(b, bits)).high
  return exponent.n >= 0n ? one : Interval.of(expInterval(exponent, resultBits).high, resultBits).high.min(one)
}

/** The largest rho that gives (epsilon, delta)-privacy, rounded down: 0 for delta 0. epsilon > 0, 0 <= delta < 1/2. */
export function rhoCap(epsilon: Fraction, delta: Fraction): Fraction {
  check(epsilon.isPositive() && delta.n >= 0n && delta.add(delta).isLess(one), 'a cap has epsilon > 0 and 0 <= delta < 1/2')
  if (delta.isZero()) return delta
  return keptRho(`${epsilon.toString()} ${delta.toString()}`, () => computeRhoCap(epsilon, delta))
}

function computeRhoCap(epsilon: Fraction, delta: Fraction): Fraction {
  // rho = h(b) / (b(1+b)), h = ln delta + b epsilon - b ln b + (1+b) ln(1+b). With h' = epsilon + ln((1+b)/b) it falls where h'·b(1+b) < (1+2b) h.
  const b = leastWhere((x, bits) => {
    const rise = Interval.of(epsilon, bits).add(lnInterval(one.add(x).div(x), bits))
    const least = rise.mul(Interval.of(x.mul(one.add(x)), bits))
    return least.sub(rhoNumerator(epsilon, delta, x, bits).mul(Interval.of(one.add(x).add(x), bits))).high.n < 0n
  })
  check(b !== null, 'a positive delta has a best order')
  const bits = workBits(b, epsilon)
  return Interval.of(
    rhoNumerator(epsilon, delta, b, bits)
      .div(Interval.of(b.mul(one.add(b)), bits))
      .low.max(Fraction.zero),
    resultBits,
  ).low
}

function rhoNumerator(epsilon: Fraction, delta: Fraction, b: Fraction, bits: bigint): Interval {
  return lnInterval(delta, bits)
    .add(Interval.of(b.mul(epsilon), bits))
    .sub(entropy(b, bits))
}

/** The least epsilon at which rho-zCDP gives (epsilon, delta)-privacy, rounded up; at least 0. rho >= 0, 0 < delta < 1. */
export function epsilonOf(rho: Fraction, delta: Fraction): Fraction {
  check(rho.n >= 0n && delta.isPositive() && delta.isLess(one), 'a conversion has rho >= 0 and 0 < delta < 1')
  if (rho.isZero()) return rho
  return keptEpsilon(`${rho.toString()} ${delta.toString()}`, () => computeEpsilon(rho, delta))
}

function computeEpsilon(rho: Fraction, delta: Fraction): Fraction {
  // epsilon = (1+b) rho + (ln(1/delta) + b ln b - (1+b) ln(1+b)) / b rises where b² rho + ln delta + ln(1+b) > 0.
  const b = leastWhere((x, bits) =>
    Interval.of(x.mul(x).mul(rho), bits)
      .add(lnInterval(delta, bits))
      .add(lnInterval(one.add(x), bits))
      .low.isPositive(),
  )
  check(b !== null, 'a positive rho has a best order')
  const bits = workBits(b, rho)
  const rest = entropy(b, bits).sub(lnInterval(delta, bits)).div(Interval.of(b, bits))
  return Interval.of(Interval.of(one.add(b).mul(rho), bits).add(rest).high.max(Fraction.zero), resultBits).high
}

/** b ln b - (1+b) ln(1+b), which is negative. */
function entropy(b: Fraction, bits: bigint): Interval {
  const more = one.add(b)
  return Interval.of(b, bits)
    .mul(lnInterval(b, bits))
    .sub(Interval.of(more, bits).mul(lnInterval(more, bits)))
}

/** Bits that survive the cancellation of terms of size b ln b and b * magnitude in a result of at least 2^-|b|. */
function workBits(b: Fraction, magnitude: Fraction): bigint {
  return resultBits + 40n + 3n * (bitLength(b.ceil()) + bitLength(one.div(b).ceil())) + bitLength(magnitude.ceil())
}

/**
 * The least b at which a condition holds that holds from some b on, to one part in 2^steps; null where it holds below every b that is sought. An error near the
 * border only costs sharpness, never soundness.
 */
function leastWhere(holds: (b: Fraction, bits: bigint) => boolean): Fraction | null {
  const test = (b: Fraction) => holds(b, searchBits + 3n * (bitLength(b.ceil()) + bitLength(one.div(b).ceil())))
  let exponent = 0n
  let step = 1n
  const below = test(power(exponent))
  // Doubling strides away from 1, then bisection of the exponent, then of b itself.
  let [low, high] = below ? [-step, exponent] : [exponent, step]
  while (test(power(below ? low : high)) === below) {
    if (step > exponentCeiling) {
      check(below, 'the best order lies within reach')
      return null
    }
    step *= 2n
    ;[low, high] = below ? [-step, low] : [high, step]
  }
  while (high - low > 1n) {
    exponent = (low + high) >> 1n
    if (test(power(exponent))) high = exponent
    else low = exponent
  }
  let [least, most] = [power(low), power(high)]
  for (let i = 0; i < steps; i++) {
    const middle = least.add(most).mul(half)
    if (test(middle)) most = middle
    else least = middle
  }
  return most
}

const one = Fraction.one
const half = Fraction.make(1n, 2n)

function power(exponent: bigint): Fraction {
  return exponent >= 0n ? Fraction.make(1n << exponent) : Fraction.make(1n, 1n << -exponent)
}
