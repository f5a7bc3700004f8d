import { check } from './check.ts'
import { Fraction } from './fraction.ts'

/** Number of binary digits of a non-negative integer; 0 for 0. */
export function bitLength(value: bigint): bigint {
  if (value === 0n) return 0n
  const hex = value.toString(16)
  return BigInt((hex.length - 1) * 4 + parseInt(hex.charAt(0), 16).toString(2).length)
}

/** The greatest integer whose square is not above `value`, by Newton's iteration from above. */
export function integerSquareRoot(value: bigint): bigint {
  check(value >= 0n, 'a square root needs a non-negative value')
  if (value === 0n) return 0n
  let root = 1n << ((bitLength(value) + 1n) >> 1n)
  for (;;) {
    const next = (root + value / root) >> 1n
    if (next >= root) return root
    root = next
  }
}

/** n / d (d > 0) on a dyadic grid of `bits` or one more significant binary digits, rounded towards the named side. */
export function roundRatio(n: bigint, d: bigint, bits: bigint, direction: 'up' | 'down'): Fraction {
  if (n === 0n) return Fraction.zero
  if (n < 0n) return roundRatio(-n, d, bits, direction === 'up' ? 'down' : 'up').neg()
  const shift = bits - bitLength(n) + bitLength(d)
  const [top, bottom] = shift >= 0n ? [n << shift, d] : [n, d << -shift]
  const quotient = top / bottom
  const rounded = direction === 'up' && quotient * bottom !== top ? quotient + 1n : quotient
  return shift >= 0n ? Fraction.make(rounded, 1n << shift) : Fraction.make(rounded << -shift)
}

/** The value on a dyadic grid of `bits` or one more significant binary digits, rounded towards the named side; unchanged where it lies on the grid. */
export function roundSignificant(value: Fraction, bits: bigint, direction: 'up' | 'down'): Fraction {
  return roundRatio(value.n, value.d, bits, direction)
}
