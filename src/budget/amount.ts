import { check } from '../base/check.ts'
import { Fraction } from '../base/fraction.ts'

/** The ledger's fixed units: epsilon in 1e-12, rho in 1e-15, delta in 1e-20. */
export type Meter = 'epsilon' | 'rho' | 'delta'

const unitsPerOne: Readonly<Record<Meter, bigint>> = { epsilon: 10n ** 12n, rho: 10n ** 15n, delta: 10n ** 20n }

/** What is spent, as a decimal integer text in the meter's unit, rounded up: against the analyst. */
export function spentAmount(meter: Meter, value: Fraction): string {
  check(value.n >= 0n, 'an amount is not negative')
  return value.mul(Fraction.make(unitsPerOne[meter])).ceil().toString()
}

/** What may be spent, as a decimal integer text in the meter's unit, rounded down: against the analyst. */
export function capAmount(meter: Meter, value: Fraction): string {
  check(value.n >= 0n, 'an amount is not negative')
  return value.mul(Fraction.make(unitsPerOne[meter])).floor().toString()
}

/** The exact value of a stored amount; a RangeError where the text is no decimal integer of at least 0. */
export function fromAmount(meter: Meter, text: string): Fraction {
  if (!/^\d{1,400}$/.test(text)) throw new RangeError('not a stored amount')
  return Fraction.make(BigInt(text), unitsPerOne[meter])
}
