/** An exact decimal number: units / 10^scale, scale 0 or more. */
export interface Decimal {
  readonly units: bigint
  readonly scale: number
}

const form = /^([+-]?)(\d+)(?:\.(\d+))?(?:[eE]([+-]?\d{1,3}))?$/

/** Reads `12`, `-0.5`, `1e-8`; null for anything else. Up to 400 digits and exponents from -400 to 400, so that a short text cannot ask for a huge number. */
export function readDecimal(text: string): Decimal | null {
  const found = text.length <= 400 ? form.exec(text) : null
  if (found === null) return null
  const [, sign, whole = '', fraction = '', exponent = '0'] = found
  if (Number(exponent) > 400 || Number(exponent) < -400) return null
  const digits = BigInt(whole + fraction) * (sign === '-' ? -1n : 1n)
  const scale = fraction.length - Number(exponent)
  return scale < 0 ? { units: digits * 10n ** BigInt(-scale), scale: 0 } : { units: digits, scale }
}

/** Without exponent and without trailing zeros: 1e3 → 1000, 0.50 → 0.5. */
export function printDecimal(value: Decimal): string {
  const negative = value.units < 0n
  const digits = (negative ? -value.units : value.units).toString().padStart(value.scale + 1, '0')
  const whole = digits.slice(0, digits.length - value.scale)
  const fraction = digits.slice(digits.length - value.scale).replace(/0+$/, '')
  return `${negative ? '-' : ''}${whole}${fraction === '' ? '' : `.${fraction}`}`
}

/** Negative, 0n or positive, like a - b. */
export function compareDecimals(a: Decimal, b: Decimal): bigint {
  const [left, right] = aligned(a, b)
  return left - right
}

export function isWhole(value: Decimal): boolean {
  return value.units % 10n ** BigInt(value.scale) === 0n
}

/** Whether `value` is a whole number of steps; `step` is not 0. */
export function isMultiple(value: Decimal, step: Decimal): boolean {
  const [units, stepUnits] = aligned(value, step)
  return units % stepUnits === 0n
}

/** The multiples of `step` (above 0) just below and just above `value`. */
export function multiplesAround(value: Decimal, step: Decimal): readonly [Decimal, Decimal] {
  const [units, stepUnits, scale] = aligned(value, step)
  const rest = ((units % stepUnits) + stepUnits) % stepUnits
  return [
    { units: units - rest, scale },
    { units: units - rest + (rest === 0n ? 0n : stepUnits), scale },
  ]
}

function aligned(a: Decimal, b: Decimal): readonly [bigint, bigint, number] {
  const scale = Math.max(a.scale, b.scale)
  return [a.units * 10n ** BigInt(scale - a.scale), b.units * 10n ** BigInt(scale - b.scale), scale]
}
