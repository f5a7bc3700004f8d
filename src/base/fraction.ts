/** Which way a rounding goes: up is towards +infinity, down towards -infinity, nearest breaks ties away from zero. */
export type Direction = 'up' | 'down' | 'nearest'

/** Decimal exponents beyond this are refused, so that a short text cannot ask for a huge number. */
const exponentCeiling = 400
const textCeiling = 1000

/** An exact rational in lowest terms, d > 0. Arithmetic never rounds; what rounds names its direction. */
export class Fraction {
  static readonly zero = new Fraction(0n, 1n)
  static readonly one = new Fraction(1n, 1n)

  readonly n: bigint
  readonly d: bigint

  private constructor(n: bigint, d: bigint) {
    this.n = n
    this.d = d
    Object.freeze(this)
  }

  /** n / d in lowest terms; a RangeError where d is 0. */
  static make(this: void, n: bigint, d = 1n): Fraction {
    if (d === 0n) throw new RangeError('division by zero')
    if (d < 0n) return Fraction.make(-n, -d)
    if (d === 1n) return new Fraction(n, d)
    const common = (d & (d - 1n)) === 0n ? commonPowerOfTwo(n, d) : greatestCommonDivisor(n < 0n ? -n : n, d)
    return new Fraction(n / common, d / common)
  }

  /** Reads decimal text ('0.1', '-3', '1e-8', '1.5E+30') exactly; a RangeError for anything else. */
  static parse(this: void, text: string): Fraction {
    const parts = text.length > textCeiling ? null : /^([+-]?)(\d*)(?:\.(\d*))?(?:[eE]([+-]?\d{1,6}))?$/.exec(text)
    const whole = parts?.[2] ?? ''
    const rest = parts?.[3] ?? ''
    if (parts === null || whole + rest === '') throw new RangeError('not a decimal number')
    const exponent = parseInt(parts[4] ?? '0', 10)
    if (exponent > exponentCeiling || exponent < -exponentCeiling) throw new RangeError(`the exponent is beyond ${exponentCeiling}`)
    const digits = BigInt(whole + rest)
    const n = parts[1] === '-' ? -digits : digits
    const shift = BigInt(exponent - rest.length)
    return shift < 0n ? Fraction.make(n, 10n ** -shift) : Fraction.make(n * 10n ** shift)
  }

  /** Reads what toString printed, 'n' or 'n/d'; a RangeError for anything else. */
  static parseRatio(this: void, text: string): Fraction {
    const parts = /^(-?\d+)(?:\/(\d+))?$/.exec(text)
    if (parts === null) throw new RangeError('not a ratio of integers')
    return Fraction.make(BigInt(parts[1] ?? ''), BigInt(parts[2] ?? '1'))
  }

  add(other: Fraction): Fraction {
    return this.d === other.d ? Fraction.make(this.n + other.n, this.d) : Fraction.make(this.n * other.d + other.n * this.d, this.d * other.d)
  }

  sub(other: Fraction): Fraction {
    return this.d === other.d ? Fraction.make(this.n - other.n, this.d) : Fraction.make(this.n * other.d - other.n * this.d, this.d * other.d)
  }

  mul(other: Fraction): Fraction {
    return Fraction.make(this.n * other.n, this.d * other.d)
  }

  /** A RangeError where `other` is 0. */
  div(other: Fraction): Fraction {
    return Fraction.make(this.n * other.d, this.d * other.n)
  }

  neg(): Fraction {
    return new Fraction(-this.n, this.d)
  }

  /** -1, 0 or 1, as this is less than, equal to or greater than `other`. */
  compare(other: Fraction): -1 | 0 | 1 {
    const difference = this.n * other.d - other.n * this.d
    return difference < 0n ? -1 : difference > 0n ? 1 : 0
  }

  equals(other: Fraction): boolean {
    return this.n === other.n && this.d === other.d
  }

  isLess(other: Fraction): boolean {
    return this.compare(other) < 0
  }

  isAtMost(other: Fraction): boolean {
    return this.compare(other) <= 0
  }

  isZero(): boolean {
    return this.n === 0n
  }

  isPositive(): boolean {
    return this.n > 0n
  }

  min(other: Fraction): Fraction {
    return this.isAtMost(other) ? this : other
  }

  max(other: Fraction): Fraction {
    return this.isAtMost(other) ? other : this
  }

  /** The greatest integer that is not greater. */
  floor(): bigint {
    const quotient = this.n / this.d
    return this.n < 0n && quotient * this.d !== this.n ? quotient - 1n : quotient
  }

  /** The least integer that is not less. */
  ceil(): bigint {
    return -this.neg().floor()
  }

  /** The integer on the named side; nearest breaks ties away from zero. */
  round(direction: Direction): bigint {
    switch (direction) {
      case 'up':
        return this.ceil()
      case 'down':
        return this.floor()
      case 'nearest':
        return this.n < 0n ? -this.neg().round('nearest') : Fraction.make(2n * this.n + this.d, 2n * this.d).floor()
    }
  }

  /** Decimal text with exactly `places` digits after the point (none, and no point, for 0). */
  toDecimal(places: number, direction: Direction): string {
    const scaled = this.mul(Fraction.make(10n ** BigInt(places))).round(direction)
    const digits = (scaled < 0n ? -scaled : scaled).toString().padStart(places + 1, '0')
    const text = places === 0 ? digits : `${digits.slice(0, -places)}.${digits.slice(-places)}`
    return scaled < 0n ? `-${text}` : text
  }

  /** A double near the value, for display only: never a step of a computation that counts. */
  toApproximate(): number {
    if (this.n === 0n) return 0
    const size = (this.n < 0n ? -this.n : this.n).toString().length - this.d.toString().length
    const shift = 20 - size
    const scaled = shift >= 0 ? (this.n * 10n ** BigInt(shift)) / this.d : this.n / (this.d * 10n ** BigInt(-shift))
    return parseFloat(`${scaled}e${-shift}`)
  }

  /** Exact text, 'n' or 'n/d', which parseRatio reads back. */
  toString(): string {
    return this.d === 1n ? this.n.toString() : `${this.n}/${this.d}`
  }

  toJSON(): string {
    return this.toString()
  }
}

function greatestCommonDivisor(a: bigint, b: bigint): bigint {
  let [x, y] = [a, b]
  while (y !== 0n) [x, y] = [y, x % y]
  return x
}

/** d is a power of two, so the common divisor is the lesser of d and the lowest set bit of n. */
function commonPowerOfTwo(n: bigint, d: bigint): bigint {
  const lowest = n & -n
  return lowest === 0n || lowest > d ? d : lowest
}
