import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'

const anyFraction = fc.tuple(fc.bigInt(-(10n ** 30n), 10n ** 30n), fc.bigInt(1n, 10n ** 20n)).map(([n, d]) => Fraction.make(n, d))

describe('an exact fraction', () => {
  test('is kept in lowest terms with a positive denominator', () => {
    expect(Fraction.make(6n, -8n)).toMatchObject({ n: -3n, d: 4n })
    expect(Fraction.make(0n, 64n)).toMatchObject({ n: 0n, d: 1n })
    expect(Fraction.make(-12n, 16n)).toMatchObject({ n: -3n, d: 4n })
    expect(Fraction.make(256n, 16n)).toMatchObject({ n: 16n, d: 1n })
    expect(() => Fraction.make(1n, 0n)).toThrow(RangeError)
  })

  test('reads decimal text without passing through a double', () => {
    expect(Fraction.parse('1e-8').toString()).toBe('1/100000000')
    expect(Fraction.parse('0.1').toString()).toBe('1/10')
    expect(Fraction.parse('1e30').n).toBe(10n ** 30n)
    expect(Fraction.parse('-2.50E+1').toString()).toBe('-25')
    expect(Fraction.parse('.5').toString()).toBe('1/2')
    expect(Fraction.parse('5.').toString()).toBe('5')
    expect(Fraction.parse('0.10000000000000000000000000000001').d).toBe(10n ** 32n)
  })

  test.each(['', '.', '-', 'e5', '1e', '1.2.3', ' 1', '1 ', '0x10', 'NaN', 'Infinity', '1/2', '1e401', '1e-401', '1e9999999', '१', '9'.repeat(1001)])(
    'refuses the text %j',
    (text) => {
      expect(() => Fraction.parse(text)).toThrow(RangeError)
    },
  )

  test('is read back from its exact text', () => {
    fc.assert(fc.property(anyFraction, (a) => Fraction.parseRatio(a.toString()).equals(a)))
    expect(() => Fraction.parseRatio('1/0')).toThrow(RangeError)
    expect(() => Fraction.parseRatio('1/-2')).toThrow(RangeError)
    expect(JSON.stringify({ scale: Fraction.make(5n, 2n) })).toBe('{"scale":"5/2"}')
  })

  test('obeys the laws of a field', () => {
    fc.assert(
      fc.property(anyFraction, anyFraction, anyFraction, (a, b, c) => {
        expect(a.add(b).mul(c)).toEqual(a.mul(c).add(b.mul(c)))
        expect(a.sub(b)).toEqual(b.sub(a).neg())
        if (!b.isZero()) expect(a.div(b).mul(b)).toEqual(a)
        expect(a.compare(b)).toBe(-b.compare(a))
        expect(a.min(b).add(a.max(b))).toEqual(a.add(b))
      }),
    )
  })

  test('rounds in the direction it is told', () => {
    const half = Fraction.make(-5n, 2n)
    expect([half.floor(), half.ceil(), half.round('nearest')]).toEqual([-3n, -2n, -3n])
    expect(Fraction.make(-7n, 1n).floor()).toBe(-7n)
    expect(Fraction.make(2n, 3n).toDecimal(3, 'up')).toBe('0.667')
    expect(Fraction.make(2n, 3n).toDecimal(3, 'down')).toBe('0.666')
    expect(Fraction.make(-2n, 3n).toDecimal(3, 'up')).toBe('-0.666')
    expect(Fraction.make(-2n, 3n).toDecimal(3, 'down')).toBe('-0.667')
    expect(Fraction.make(1n, 8n).toDecimal(2, 'nearest')).toBe('0.13')
    expect(Fraction.make(-1n, 1000n).toDecimal(2, 'nearest')).toBe('0.00')
    expect(Fraction.make(7n, 2n).toDecimal(0, 'up')).toBe('4')
  })

  test('shows a double near itself, whatever its size', () => {
    expect(Fraction.make(1n, 3n).toApproximate()).toBeCloseTo(1 / 3, 15)
    expect(Fraction.parse('-1e300').toApproximate()).toBe(-1e300)
    expect(Fraction.parse('2.5e-300').toApproximate()).toBe(2.5e-300)
    expect(Fraction.make(0n, 5n).toApproximate()).toBe(0)
  })
})
