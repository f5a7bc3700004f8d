import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { exp, expInterval, ln, lnInterval, oneMinusExpInterval, piInterval, sqrt, sqrtInterval, tanh } from '../../src/base/exponential.ts'
import { Fraction } from '../../src/base/fraction.ts'
import { Interval } from '../../src/base/interval.ts'
import { remember } from '../../src/base/remember.ts'
import { bitLength, integerSquareRoot, roundSignificant } from '../../src/base/significant.ts'

const parse = Fraction.parse
const positive = fc.tuple(fc.bigInt(1n, 10n ** 12n), fc.bigInt(1n, 10n ** 12n)).map(([n, d]) => Fraction.make(n, d))

/** Holds that down <= the reference's value <= up to 60 digits; the reference is cut off, not rounded. */
function expectAround(compute: (side: 'up' | 'down') => Fraction, reference: string, places: number): void {
  const [down, up] = [compute('down'), compute('up')]
  expect(down.isLess(up)).toBe(true)
  expect(down.toDecimal(places, 'down')).toBe(reference)
  expect(up.toDecimal(places, 'down')).toBe(reference)
}

describe('enclosed functions', () => {
  // Published constants: e, ln 10, sqrt 2, pi to 55 places and more; tanh 1/2 and e^-100.25 by independent 64-digit arithmetic.
  test('agree with known digits and keep to the side they are told', () => {
    expectAround((side) => exp(Fraction.one, side), '2.7182818284590452353602874713526624977572470936999595749', 55)
    expectAround((side) => exp(parse('-100.25'), side), `0.${'0'.repeat(43)}2897198083210147807197361066895866065586`, 83)
    expectAround((side) => ln(parse('10'), side), '2.3025850929940456840179914546843642076011014886287729760', 55)
    expectAround((side) => ln(Fraction.one.div(parse('0.9999999')), side), '0.0000001000000050000003333333583333353333335000', 46)
    expectAround((side) => sqrt(parse('2'), side), '1.4142135623730950488016887242096980785696718753769480731', 55)
    expectAround((side) => tanh(parse('0.5'), side), '0.4621171572600097585023184836436725487302892803301130385', 55)
    expectAround((side) => piInterval(200n).end(side), '3.1415926535897932384626433832795028841971693993751058209', 55)
  })

  test('keep their relative width for small values', () => {
    const near = oneMinusExpInterval(parse('1e-20'), 100n)
    // 1 - e^-x = x - x²/2 + x³/6 - …
    const truth = parse('1e-20')
      .sub(parse('0.5e-40'))
      .add(Fraction.make(1n, 6n * 10n ** 60n))
    expect(near.low.isLess(truth) && truth.isLess(near.high)).toBe(true)
    expect(near.high.sub(near.low).isLess(parse('1e-49'))).toBe(true)
    expect(tanh(parse('1e-9'), 'down').toDecimal(30, 'down')).toBe('0.000000000999999999999999999666')
    expect(tanh(parse('1e30'), 'up')).toEqual(Fraction.one)
    expect(tanh(parse('1e30'), 'down').isLess(Fraction.one)).toBe(true)
  })

  test('are exact where the value is', () => {
    expect(sqrt(parse('6.25'), 'up')).toEqual(parse('2.5'))
    expect(sqrt(parse('6.25'), 'down')).toEqual(parse('2.5'))
    expect(exp(Fraction.zero, 'up')).toEqual(Fraction.one)
    expect(sqrt(Fraction.zero, 'up')).toEqual(Fraction.zero)
  })

  test('enclose the value at every precision: the wider holds the narrower, and inverses meet', () => {
    fc.assert(
      fc.property(positive, (x) => {
        const small = x.min(Fraction.make(900n))
        for (const [wide, narrow] of [
          [expInterval(small, 40n), expInterval(small, 300n)],
          [expInterval(small.neg(), 40n), expInterval(small.neg(), 300n)],
          [lnInterval(x, 40n), lnInterval(x, 300n)],
          [sqrtInterval(x, 40n), sqrtInterval(x, 300n)],
        ] as const) {
          expect(wide.low.isAtMost(narrow.low) && narrow.high.isAtMost(wide.high)).toBe(true)
        }
        const back = expInterval(lnInterval(x, 120n).low, 120n)
        expect(back.low.isAtMost(x)).toBe(true)
        expect(x.isAtMost(expInterval(lnInterval(x, 120n).high, 120n).high)).toBe(true)
        const root = sqrtInterval(x, 100n)
        expect(root.low.mul(root.low).isAtMost(x) && x.isAtMost(root.high.mul(root.high))).toBe(true)
      }),
      { numRuns: 60, seed: 7 },
    )
  })

  test('reach far: e^-1e30 lies between 0 and a trifle, and what is out of range is our bug', () => {
    expect(exp(parse('-1e30'), 'down')).toEqual(Fraction.zero)
    expect(exp(parse('-1e30'), 'up').isLess(parse('1e-300'))).toBe(true)
    expect(() => exp(parse('1e30'), 'up')).toThrow(BrokenCheck)
    expect(() => ln(Fraction.zero, 'up')).toThrow(BrokenCheck)
    expect(() => sqrt(Fraction.make(-1n), 'up')).toThrow(BrokenCheck)
  })
})

describe('intervals', () => {
  const ends = fc.tuple(fc.bigInt(-1000n, 1000n), fc.bigInt(0n, 1000n), fc.bigInt(1n, 99n))

  test('hold the result of every operation on what they hold', () => {
    fc.assert(
      fc.property(ends, ends, ([a, wa, d], [b, wb, e]) => {
        const [x, y] = [
          Interval.between(Fraction.make(a, d), Fraction.make(a + wa, d), 20n),
          Interval.between(Fraction.make(b, e), Fraction.make(b + wb, e), 20n),
        ]
        const holds = (z: Interval, value: Fraction) => z.low.isAtMost(value) && value.isAtMost(z.high)
        for (const p of [Fraction.make(a, d), Fraction.make(a + wa, d)]) {
          for (const q of [Fraction.make(b, e), Fraction.make(b + wb, e)]) {
            expect(holds(x.add(y), p.add(q)) && holds(x.sub(y), p.sub(q)) && holds(x.mul(y), p.mul(q))).toBe(true)
            if (y.low.isPositive()) expect(holds(x.div(y), p.div(q))).toBe(true)
          }
        }
      }),
      { seed: 11 },
    )
  })

  test('are divided by positive ones only', () => {
    expect(() => Interval.integer(1n, 20n).div(Interval.integer(0n, 20n))).toThrow(BrokenCheck)
  })
})

describe('significant digits', () => {
  test('are cut towards the named side', () => {
    expect(roundSignificant(parse('0.7'), 4n, 'up').toString()).toBe('23/32')
    expect(roundSignificant(parse('0.7'), 4n, 'down').toString()).toBe('11/16')
    expect(roundSignificant(parse('-0.7'), 4n, 'up').toString()).toBe('-11/16')
    expect(roundSignificant(parse('1e30'), 4n, 'up').isLess(parse('1e30'))).toBe(false)
    expect(roundSignificant(parse('12'), 64n, 'up')).toEqual(parse('12'))
  })

  test('and lengths and roots of integers are exact', () => {
    fc.assert(
      fc.property(fc.bigInt(0n, 1n << 300n), (value) => {
        expect(bitLength(value)).toBe(value === 0n ? 0n : BigInt(value.toString(2).length))
        const root = integerSquareRoot(value)
        expect(root * root <= value && value < (root + 1n) * (root + 1n)).toBe(true)
      }),
    )
  })
})

describe('a remembered function', () => {
  test('computes once for a key and forgets the oldest past its ceiling', () => {
    let computed = 0
    const kept = remember<number>(2)
    const ask = (key: string) => kept(key, () => ++computed)
    expect([ask('a'), ask('b'), ask('a'), ask('c'), ask('b'), ask('a')]).toEqual([1, 2, 1, 3, 2, 4])
  })
})
