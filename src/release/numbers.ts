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

/** A quotient in as many places as PostgreSQL's numeric division gives: at least 16 significant digits, in groups of four. */
export function quotientText(value: Fraction): string {
  const size = value.isLess(Fraction.zero) ? value.neg() : value
  let places = 16
  if (size.isLess(Fraction.one)) places = 20
  for (let bound = Fraction.make(10_000n); places > 0 && bound.isAtMost(size); bound = bound.mul(Fraction.make(10_000n))) places -= 4
  return value.toDecimal(places, 'nearest')
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
