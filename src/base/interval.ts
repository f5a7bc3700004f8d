import { check } from './check.ts'
import { Fraction } from './fraction.ts'
import { roundRatio, roundSignificant } from './significant.ts'

/**
 * Two dyadic ends that hold a real number between them. INVARIANT ENCLOSED: every operation rounds its low end down and its high end up, to `bits`
 * significant binary digits, so the true value never escapes.
 */
export class Interval {
  readonly low: Fraction
  readonly high: Fraction
  readonly bits: bigint

  private constructor(low: Fraction, high: Fraction, bits: bigint) {
    check(low.isAtMost(high), 'an interval is not empty')
    this.low = low
    this.high = high
    this.bits = bits
  }

  static between(low: Fraction, high: Fraction, bits: bigint): Interval {
    return new Interval(roundSignificant(low, bits, 'down'), roundSignificant(high, bits, 'up'), bits)
  }

  static of(value: Fraction, bits: bigint): Interval {
    return Interval.between(value, value, bits)
  }

  static integer(value: bigint, bits: bigint): Interval {
    return Interval.of(Fraction.make(value), bits)
  }

  add(other: Interval): Interval {
    return Interval.between(this.low.add(other.low), this.high.add(other.high), this.bits)
  }

  sub(other: Interval): Interval {
    return this.add(other.neg())
  }

  neg(): Interval {
    return new Interval(this.high.neg(), this.low.neg(), this.bits)
  }

  mul(other: Interval): Interval {
    if (this.low.n >= 0n && other.low.n >= 0n) return Interval.between(this.low.mul(other.low), this.high.mul(other.high), this.bits)
    const corners = [this.low.mul(other.low), this.low.mul(other.high), this.high.mul(other.low), this.high.mul(other.high)] as const
    return Interval.between(
      corners.reduce((a, b) => a.min(b)),
      corners.reduce((a, b) => a.max(b)),
      this.bits,
    )
  }

  /** `other` must be wholly positive. */
  div(other: Interval): Interval {
    check(other.low.isPositive(), 'an interval is divided by a positive one only')
    const [least, most] = [other.low, other.high]
    const under = this.low.n < 0n ? least : most
    const over = this.high.n < 0n ? most : least
    return new Interval(
      roundRatio(this.low.n * under.d, this.low.d * under.n, this.bits, 'down'),
      roundRatio(this.high.n * over.d, this.high.d * over.n, this.bits, 'up'),
      this.bits,
    )
  }

  /** The end on the named side. */
  end(direction: 'up' | 'down'): Fraction {
    return direction === 'up' ? this.high : this.low
  }
}
