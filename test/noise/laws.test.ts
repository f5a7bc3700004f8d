import { describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { Fraction } from '../../src/base/fraction.ts'
import { BitSource } from '../../src/noise/bits.ts'
import { makeGaussian, makeLaplace, type Mechanism } from '../../src/noise/make-mechanism.ts'
import { draw, margin, probabilityNonzero, tailAtLeast, varianceOf } from '../../src/noise/mechanism.ts'
import { seededBytes } from './seeded-bytes.ts'

const confidence = Fraction.parse('0.95')

/** Holds that `value` is at least the reference (cut off after its last digit) and at most 1e-12 of it above. */
function expectJustAbove(value: Fraction, reference: string): void {
  const least = Fraction.parse(reference)
  expect(least.isAtMost(value), `${value.toApproximate()} is below ${reference}`).toBe(true)
  expect(value.isAtMost(least.mul(Fraction.parse('1.000000000001'))), `${value.toApproximate()} is far above ${reference}`).toBe(true)
}

// Independent 60-digit arithmetic over the closed forms of Ghosh, Roughgarden & Sundararajan 2012: scale, variance, P(X >= 10), smallest m with P(|X| > m) <=
// 0.05.
const laplaceRows = [
  ['1', '1.84134718841558463789082704543', '0.0000331900081220642305781760293234', 3n],
  ['2', '7.83539617806552752970191357177', '0.00419409798272428281885497056116', 6n],
  ['10', '199.833416633609453915303588127', '0.193129050116390292049440153387', 30n],
] as const

// Independent 60-digit arithmetic by direct summation (Canonne, Kamath & Steinke 2020): parameter, variance, P(X >= 5), smallest m with P(|X| > m) <= 0.05,
// P(0).
const gaussianRows = [
  ['1/4', '0.215012675088138486383555128063', '1.51709813204321800944813370632e-22', 1n, '0.786570707041947899704590558527'],
  ['1/2', '0.498979130832820461759167503391', '7.83475365402221226411262764677e-12', 1n, '0.564131226218842074609889964891'],
  ['1', '0.999999788767728083111723048574', '0.00000149280452937046443493867184657', 2n, '0.398942278266861705581680536389'],
  ['4', '3.99999999999999999999999999999', '0.0114921231683805269464262885676', 4n, '0.199471140200716338969973029967'],
  ['25', '25.0', '0.183659973973444420302254815182', 10n, '0.0797884560802865355879892119868'],
  ['1000', '1000.0', '0.443418196233474613103579951013', 62n, null],
] as const

describe('the discrete Laplace law', () => {
  test.each(laplaceRows)('of scale %s has its variance, tail and margin', (scale, variance, tail, half) => {
    const mechanism = makeLaplace(Fraction.parseRatio(scale))
    expectJustAbove(varianceOf(mechanism), variance)
    expectJustAbove(tailAtLeast(mechanism, 10n), tail)
    expect(margin(mechanism, confidence)).toBe(half)
  })

  test('gives both tails of a sign their share', () => {
    const mechanism = makeLaplace(Fraction.make(3n))
    const whole = tailAtLeast(mechanism, -4n).add(tailAtLeast(mechanism, 5n))
    expectJustAbove(whole, '1')
    expect(margin(mechanism, Fraction.zero)).toBe(0n)
  })
})

describe('the discrete Gaussian law', () => {
  test.each(gaussianRows)('of parameter %s has its variance, tail and margin', (parameter, variance, tail, half, atZero) => {
    const mechanism = makeGaussian(Fraction.parseRatio(parameter))
    expectJustAbove(varianceOf(mechanism), variance)
    if (atZero !== null) {
      expectJustAbove(tailAtLeast(mechanism, 5n), tail)
      expectJustAbove(probabilityNonzero(mechanism), Fraction.one.sub(Fraction.parse(atZero)).sub(Fraction.parse('1e-30')).toDecimal(28, 'down'))
    } else {
      const loose = tailAtLeast(mechanism, 5n).toApproximate() / Number(tail) - 1
      expect(loose).toBeGreaterThan(0)
      expect(loose).toBeLessThan(2e-4)
    }
    expect(margin(mechanism, confidence)).toBe(half)
  })

  test('is bounded as tightly where it is not summed: sums and bounds meet within one part in five hundred, far tails in two hundred', () => {
    const [summed, bounded] = [makeGaussian(Fraction.make(400n)), makeGaussian(Fraction.make(400n).add(Fraction.parse('1e-20')))]
    for (const m of [1n, 10n, 20n, 40n, 100n]) {
      const [exact, bound] = [tailAtLeast(summed, m), tailAtLeast(bounded, m)]
      expect(exact.isAtMost(bound)).toBe(true)
      expect(bound.toApproximate() / exact.toApproximate() - 1).toBeLessThan(m > 40n ? 5e-3 : 2e-3)
    }
    expectJustAbove(tailAtLeast(summed, -3n).add(tailAtLeast(summed, 4n)), '1')
    const whole = tailAtLeast(bounded, -3n).add(tailAtLeast(bounded, 4n)).toApproximate()
    expect(whole).toBeGreaterThanOrEqual(1)
    expect(whole).toBeLessThan(1.05)
  })

  test('has a margin within one percent of z sigma where sigma is large, and never a smaller one', () => {
    const half = margin(makeGaussian(Fraction.parse('1e12')), confidence)
    expect(half).toBeGreaterThanOrEqual(1_959_964n)
    expect(half).toBeLessThan(1_960_000n)
  })

  test('narrows to nothing and widens without end in time', () => {
    expect(margin(makeGaussian(Fraction.parse('1e-30')), confidence)).toBe(0n)
    expect(margin(makeGaussian(Fraction.parse('1e60')), confidence).toString()).toMatch(/^195996398454005\d{16}$/)
  })
})

describe('a mechanism', () => {
  test('leaves the exact value untouched, in effect, where the budget is without measure', () => {
    const slight = Fraction.parse('1e-12')
    expect(probabilityNonzero(makeLaplace(Fraction.parse('1e-30'))).isLess(slight)).toBe(true)
    expect(probabilityNonzero(makeGaussian(Fraction.parse('1e-30'))).isLess(slight)).toBe(true)
    expectJustAbove(probabilityNonzero(makeLaplace(Fraction.one)), '0.53788284273999024149768151635')
  })

  test('draws by its law, and the same for the same bits', () => {
    for (const mechanism of [makeLaplace(Fraction.make(20n)), makeGaussian(Fraction.make(400n))]) {
      const sample = (seed: string) => {
        const bits = new BitSource(seededBytes(seed))
        return Array.from({ length: 20 }, () => draw(mechanism, bits))
      }
      expect(sample('a')).toEqual(sample('a'))
      expect(sample('a')).not.toEqual(sample('b'))
    }
  })

  test('that only looks like one draws nothing', () => {
    const forged = { ...makeLaplace(Fraction.one) } as Mechanism
    expect(() => draw(forged, new BitSource(seededBytes('forged')))).toThrow(BrokenCheck)
    expect(() => Object.assign(makeLaplace(Fraction.one), { scale: Fraction.zero })).toThrow(TypeError)
  })

  test('has a confidence below 1 and a parameter above 0', () => {
    expect(() => margin(makeLaplace(Fraction.one), Fraction.one)).toThrow(BrokenCheck)
    expect(() => makeGaussian(Fraction.zero)).toThrow(BrokenCheck)
    expect(() => makeLaplace(Fraction.make(-1n))).toThrow(BrokenCheck)
  })
})
