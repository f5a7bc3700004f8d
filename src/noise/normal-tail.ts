import { expInterval, piInterval, sqrtInterval } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { Interval } from '../base/interval.ts'
import { roundSignificant } from '../base/significant.ts'

/** Beyond this many standard deviations the series is left for Mills' bounds, whose ends are 1/1600 apart. */
const far = Fraction.make(40n)
const half = Fraction.make(1n, 2n)

/** P(N >= x) of the standard normal law; relative width below 2^-bits up to x = 40, below 1/1600 beyond. */
export function normalTail(x: Fraction, bits: bigint): Interval {
  if (x.n < 0n) return Interval.of(Fraction.one, bits).sub(normalTail(x.neg(), bits))
  if (far.isLess(x)) return farTail(x, bits)
  const square = x.mul(x)
  // The series is subtracted from 1/2: e^(-x²/2) of it is left, so that many more bits are carried (1.4427 = 1 / ln 2).
  const wide = bits + square.mul(Fraction.make(73n, 100n)).ceil() + 24n
  const within = density(square, wide).mul(series(x, square, wide))
  return Interval.between(half.sub(within.high).max(Fraction.zero), half.sub(within.low), bits)
}

/** e^(-x²/2) / sqrt(2 pi). */
function density(square: Fraction, bits: bigint): Interval {
  const twoPi = piInterval(bits).mul(Interval.integer(2n, bits))
  const root = Interval.between(sqrtInterval(twoPi.low, bits).low, sqrtInterval(twoPi.high, bits).high, bits)
  return expInterval(square.mul(half).neg(), bits).div(root)
}

/** x + x³/3 + x⁵/(3·5) + …, whose product with the density is P(0 <= N <= x): all terms positive, summed once from below and once from above. */
function series(x: Fraction, square: Fraction, bits: bigint): Interval {
  const one = 1n << bits
  const [under, over] = [(square.n * one) / square.d, (square.n * one) / square.d + 1n]
  let [low, high] = [(x.n * one) / x.d, (x.n * one) / x.d + 1n]
  let [lowSum, highSum] = [low, high]
  for (let i = 3n; ; i += 2n) {
    low = ((low * under) >> bits) / i
    high = ((high * over) >> bits) / i + 2n
    lowSum += low
    highSum += high
    // Past this point each term is at most half the one before, so the rest is at most the last term (and the two units a step, in the factor 4).
    if (2n * (square.n + square.d) < i * square.d && high < 8n) break
  }
  return Interval.between(Fraction.make(lowSum, one), Fraction.make(highSum + 4n * high + 16n, one), bits)
}

/** Mills' bounds x/(1 + x²) < P(N >= x) / density < 1/x. */
function farTail(x: Fraction, bits: bigint): Interval {
  const coarse = roundSignificant(x, bits, 'down')
  const finer = roundSignificant(x, bits, 'up')
  const above = density(coarse.mul(coarse), bits).high.div(coarse)
  const below = density(finer.mul(finer), bits).low.mul(finer).div(finer.mul(finer).add(Fraction.one))
  return Interval.between(below, above, bits)
}
