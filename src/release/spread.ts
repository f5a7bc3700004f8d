import { sqrt } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import type { Spread, Units } from '../plan/release-plan.ts'
import { type Noisy, ofVariance, type Shown, type ShowOptions, square, width } from './shown.ts'

const two = Fraction.make(2n)
const nothing: Shown = { text: null, margin: null }

/**
 * Variance or standard deviation from a triple's noisy sums b0, b1, b2 of (W-u)², 2u(W-u) and u², u the units above the clamp's low end and W its width: the
 * number of rows is (b0+b1+b2)/W², the sum of u is (b1/2+b2)/W, that of u² is b2. NULL where too few rows are left. The margin is of first
 * order (delta method), withheld below five standard deviations of the number of rows.
 */
export function spread(of: Spread, noisy: Noisy, units: Units, variance: Fraction, options: ShowOptions): Shown {
  const [b0 = 0n, b1 = 0n, b2 = 0n] = noisy
  const wide = width(units)
  const wide2 = square(wide)
  const n = Fraction.make(b0 + b1 + b2).div(wide2)
  const sample = of === 'var_samp' || of === 'stddev_samp'
  if (!(sample ? Fraction.one : Fraction.zero).isLess(n)) return nothing
  const sum = Fraction.make(b1).div(two).add(Fraction.make(b2)).div(wide)
  const mean = sum.div(n)
  const squares = Fraction.make(b2)
  const least = squares
    .div(n)
    .sub(square(mean))
    .max(Fraction.zero)
    .min(wide2.div(Fraction.make(4n)))
  const correction = sample ? n.div(n.sub(Fraction.one)) : Fraction.one
  const scale = square(units.step).mul(correction)
  const value = least.mul(scale)
  const weak = square(n).isLess(variance.mul(Fraction.make(75n)).div(square(wide2)))
  const perRow = Fraction.one.div(wide2)
  const gradient = (ofSum: Fraction, ofSquares: Fraction): Fraction =>
    ofSquares
      .div(n)
      .sub(squares.mul(perRow).div(square(n)))
      .sub(two.mul(mean).mul(ofSum.div(n).sub(sum.mul(perRow).div(square(n)))))
  const parts = [
    gradient(Fraction.zero, Fraction.zero),
    gradient(Fraction.one.div(two.mul(wide)), Fraction.zero),
    gradient(Fraction.one.div(wide), Fraction.one),
  ]
  const error = parts
    .reduce((all, part) => all.add(square(part)), Fraction.zero)
    .mul(variance)
    .mul(square(scale))
  const half = weak ? null : ofVariance(error, options)
  if (of === 'var_pop' || of === 'var_samp') return { text: digits(value), margin: half }
  if (value.isZero()) return { text: '0', margin: null }
  const root = sqrt(value, 'down', 128n)
  return { text: digits(root), margin: half === null ? null : half.div(two.mul(root)) }
}

/** At least 16 significant digits, in groups of four, as PostgreSQL's numeric gives of a quotient. */
function digits(value: Fraction): string {
  let places = value.isLess(Fraction.one) ? 20 : 16
  for (let bound = Fraction.make(10_000n); places > 0 && bound.isAtMost(value); bound = bound.mul(Fraction.make(10_000n))) places -= 4
  return value.toDecimal(places, 'nearest')
}
