import { Fraction } from '../base/fraction.ts'

/** Units of a step as exact decimal text, in as many places as the step has. */
export function decimalOf(value: Fraction, step: Fraction): string {
  return value.toDecimal(placesOf(step), 'nearest')
}

/** Decimal places in which every multiple of the step is exact; at most 20 where it is no decimal. */
export function placesOf(step: Fraction): number {
  let places = 0
  while (places < 20 && 10n ** BigInt(places) % step.d !== 0n) places += 1
  return places
}

/** The weight of the leading digit of a number in base 10000, and that digit. */
function leading(value: Fraction): { readonly weight: number; readonly digit: bigint } {
  const base = Fraction.make(10_000n)
  let [size, weight] = [value.isLess(Fraction.zero) ? value.neg() : value, 0]
  if (size.isZero()) return { weight: 0, digit: 0n }
  for (; base.isAtMost(size); weight += 1) size = size.div(base)
  for (; size.isLess(Fraction.one); weight -= 1) size = size.mul(base)
  return { weight, digit: size.floor() }
}

/** sum / count in as many places as PostgreSQL's numeric division gives: at least 16 significant digits, in groups of four, and never fewer places than the sum has. */
export function quotientText(sum: Fraction, count: Fraction, sumPlaces: number): string {
  const [above, below] = [leading(sum), leading(count)]
  const weight = above.weight - below.weight - (above.digit <= below.digit ? 1 : 0)
  const wanted = 16 - 4 * weight
  const places = wanted > sumPlaces ? wanted : sumPlaces
  return sum.div(count).toDecimal(places < 1000 ? places : 1000, 'nearest')
}

const int8 = 2n ** 63n

/** A whole number within bigint, as a released count must be: noise at a tiny epsilon could leave it. */
export function wholeText(value: bigint): string {
  return (value >= int8 ? int8 - 1n : value < -int8 ? -int8 : value).toString()
}

/** The nearest whole number, halves away from zero. */
export function nearest(value: Fraction): bigint {
  return value.round('nearest')
}
