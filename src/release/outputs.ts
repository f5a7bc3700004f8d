import { unreachable } from '../base/check.ts'
import { Fraction } from '../base/fraction.ts'
import { varianceOf, margin } from '../noise/mechanism.ts'
import type { Mechanism } from '../noise/make-mechanism.ts'
import type { Output, ReleasePlan, Units } from '../plan/release-plan.ts'
import { type Noisy, ofVariance, type Shown, type ShowOptions, square, width } from './shown.ts'
import { spread } from './spread.ts'
import { decimalOf, nearest, placesOf, quotientText, wholeText } from './numbers.ts'

/** One output of one group. */
export function show(plan: ReleasePlan, output: Output, noisy: readonly Noisy[], mechanisms: readonly Mechanism[], options: ShowOptions): Shown {
  const total = plan.totals[output.total]
  const mechanism = mechanisms[output.total]
  const [a = 0n, b = 0n] = noisy[output.total] ?? []
  if (total === undefined || mechanism === undefined) throw new RangeError('an output speaks of a total the plan lacks')
  switch (output.kind) {
    case 'count': {
      const value = total.kind === 'twin' ? nearest(countOf(a, b, total.units)) : a
      const half =
        total.kind === 'twin'
          ? ofVariance(
              varianceOf(mechanism)
                .mul(Fraction.make(2n))
                .div(square(width(total.units))),
              options,
            )
          : Fraction.make(margin(mechanism, options.confidence))
      return { text: wholeText(options.nonnegative && value < 0n ? 0n : value), margin: half }
    }
    case 'sum': {
      if (total.kind === 'twin') {
        const share = Fraction.make(total.units.low).div(width(total.units))
        const value = Fraction.make(nearest(Fraction.make(a).add(Fraction.make(total.units.low).mul(countOf(a, b, total.units)))))
        const spread = square(Fraction.one.add(share)).add(square(share)).mul(square(total.units.step))
        return { text: decimalOf(value.mul(total.units.step), total.units.step), margin: ofVariance(varianceOf(mechanism).mul(spread), options) }
      }
      if (total.kind !== 'sum') throw new RangeError('a sum is made of a sum')
      return {
        text: decimalOf(Fraction.make(a).mul(total.units.step), total.units.step),
        margin: Fraction.make(margin(mechanism, options.confidence)).mul(total.units.step),
      }
    }
    case 'mean': {
      if (total.kind !== 'twin') throw new RangeError('a mean is made of twins')
      return mean(a, b, total.units, varianceOf(mechanism), options)
    }
    case 'spread': {
      if (total.kind !== 'triple') throw new RangeError('a spread is made of triples')
      return spread(output.of, noisy[output.total] ?? [], total.units, varianceOf(mechanism), options)
    }
    default:
      return unreachable(output)
  }
}

/** The noisy number of rows of a twin. */
function countOf(a: bigint, b: bigint, units: Units): Fraction {
  return Fraction.make(a + b).div(width(units))
}

/**
 * The mean, kept within its clamp; NULL where the noisy count is not positive. Its margin is that of the quotient a / (a + b) to first order (delta method), and
 * is withheld below five standard deviations of the count, where first order does not hold.
 */
function mean(a: bigint, b: bigint, units: Units, variance: Fraction, options: ShowOptions): Shown {
  const both = a + b
  if (both <= 0n) return { text: null, margin: null }
  const share = Fraction.make(a).div(Fraction.make(both)).max(Fraction.zero).min(Fraction.one)
  const value = Fraction.make(units.low)
    .add(share.mul(width(units)))
    .mul(units.step)
  const sum = square(Fraction.make(both))
  const weak = sum.isLess(variance.mul(Fraction.make(2n)).mul(Fraction.make(25n)))
  const spread = Fraction.make(a * a + b * b)
    .div(square(sum))
    .mul(square(width(units).mul(units.step)))
    .mul(variance)
  const count = countOf(a, b, units)
  return { text: quotientText(value.mul(count), count, placesOf(units.step)), margin: weak ? null : ofVariance(spread, options) }
}
