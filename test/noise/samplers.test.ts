import { describe, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { bernoulli, bernoulliExp } from '../../src/noise/bernoulli.ts'
import { BitSource } from '../../src/noise/bits.ts'
import { drawDiscreteGaussian } from '../../src/noise/discrete-gaussian.ts'
import { drawDiscreteLaplace } from '../../src/noise/discrete-laplace.ts'
import { chiSquare } from './goodness.ts'
import { givenBytes, seededBytes } from './seeded-bytes.ts'

const draws = 20_000

function many(seed: string, sample: (bits: BitSource) => bigint): readonly bigint[] {
  const bits = new BitSource(seededBytes(seed))
  return Array.from({ length: draws }, () => sample(bits))
}

function momentsOf(values: readonly bigint[]): { readonly mean: number; readonly variance: number } {
  const mean = values.reduce((sum, value) => sum + Number(value), 0) / values.length
  return { mean, variance: values.reduce((sum, value) => sum + (Number(value) - mean) ** 2, 0) / values.length }
}

/** P(k) of the discrete Laplace law (Ghosh, Roughgarden & Sundararajan 2012). */
function laplaceLaw(scale: number): (k: number) => number {
  const q = Math.exp(-1 / scale)
  return (k) => ((1 - q) / (1 + q)) * q ** Math.abs(k)
}

/** P(k) of the discrete Gaussian law (Canonne, Kamath & Steinke 2020), the normaliser summed directly. */
function gaussianLaw(variance: number): (k: number) => number {
  const term = (k: number) => Math.exp((-k * k) / (2 * variance))
  let normaliser = 1
  for (let k = 1; k < 200; k++) normaliser += 2 * term(k)
  return (k) => term(k) / normaliser
}

describe('a coin', () => {
  test('with a rational chance follows the bits it is given', () => {
    expect(bernoulli(3n, 5n, new BitSource(givenBytes(2)))).toBe(true)
    expect(bernoulli(3n, 5n, new BitSource(givenBytes(3)))).toBe(false)
    expect(bernoulli(0n, 1n, new BitSource(givenBytes()))).toBe(false)
    expect(bernoulli(1n, 1n, new BitSource(givenBytes()))).toBe(true)
  })

  test('with chance e^-g counts successes of g/1, g/2, … and comes up where they are even', () => {
    expect(bernoulliExp(1n, 2n, new BitSource(givenBytes(1)))).toBe(true) // no success
    expect(bernoulliExp(1n, 2n, new BitSource(givenBytes(0, 1)))).toBe(false) // one
    expect(bernoulliExp(1n, 2n, new BitSource(givenBytes(0, 0, 5)))).toBe(true) // two
  })

  // e^-g from a series at 25 digits; the trials of Canonne, Kamath & Steinke 2020.
  test.each([
    [1n, 4n, 0.7788007830714048],
    [1n, 2n, 0.6065306597126334],
    [1n, 1n, 0.3678794411714423],
    [5n, 2n, 0.0820849986238988],
  ])('with chance e^-(%s/%s) comes up that often', (n, d, chance) => {
    const bits = new BitSource(seededBytes(`exp ${n}/${d}`))
    let heads = 0
    for (let i = 0; i < draws; i++) if (bernoulliExp(n, d, bits)) heads++
    expect(Math.abs(heads / draws - chance)).toBeLessThan(3.5 * Math.sqrt((chance * (1 - chance)) / draws))
  })

  test('with a g beyond measure ends at once', () => {
    expect(bernoulliExp(10n ** 40n, 1n, new BitSource(seededBytes('huge')))).toBe(false)
  })
})

describe('discrete Laplace noise', () => {
  test('is reproduced from its bits', () => {
    // Scale 5/2: U = 3, kept (4 of 5 is no success); V: two successes of 1 and 1/2, then 2 of 3: heads; then one: tails; sign 1.
    const bytes = [3, 4, 0, 2, 1, 1]
    expect(drawDiscreteLaplace(Fraction.make(5n, 2n), new BitSource(givenBytes(...bytes)))).toBe(-4n) // floor((3 + 5·1) / 2)
  })

  test('draws again for a negative zero', () => {
    // Scale 1: U needs no byte and is kept; V: tails at once (1 of 2); sign negative: again; then V tails, sign positive.
    expect(drawDiscreteLaplace(Fraction.one, new BitSource(givenBytes(1, 1, 1, 0)))).toBe(0n)
    expect(drawDiscreteLaplace(Fraction.one, new BitSource(givenBytes(1, 1, 0, 2, 1, 1)))).toBe(-1n)
  })

  test.each([
    ['5/2', 12],
    ['1', 6],
    ['1/3', 1],
    ['10', 30],
  ])('of scale %s follows its exact law', (text, reach) => {
    const scale = Fraction.parseRatio(text)
    const sample = many(`laplace ${text}`, (bits) => drawDiscreteLaplace(scale, bits))
    const { statistic, critical } = chiSquare(sample, laplaceLaw(scale.toApproximate()), reach)
    expect(statistic).toBeLessThan(critical)
  })

  test('has the variance of its law', () => {
    // 12.334658248220551 = 2q/(1-q)² at q = e^(-2/5).
    const { mean, variance } = momentsOf(many('laplace moments', (bits) => drawDiscreteLaplace(Fraction.make(5n, 2n), bits)))
    expect(Math.abs(mean)).toBeLessThan(4 * Math.sqrt(12.33 / draws))
    expect(Math.abs(variance / 12.334658248220551 - 1)).toBeLessThan(0.06)
  })

  test('without the rule against a negative zero would be caught', () => {
    const faulty = (bits: BitSource) => {
      let size = 0n
      while (bernoulliExp(1n, 1n, bits)) size++
      return bits.below(2n) === 1n ? -size : size
    }
    const { statistic, critical } = chiSquare(many('laplace fault', faulty), laplaceLaw(1), 6)
    expect(statistic).toBeGreaterThan(10 * critical)
  })

  test('of an off scale would be caught', () => {
    const { statistic, critical } = chiSquare(
      many('laplace scale', (bits) => drawDiscreteLaplace(Fraction.make(26n, 10n), bits)),
      laplaceLaw(2.5),
      12,
    )
    expect(statistic).toBeGreaterThan(critical)
  })
})

describe('discrete Gaussian noise', () => {
  test('is reproduced from its bits', () => {
    // Variance 1: t = 2. U = 1 of [0, 2), kept (1 of 2 is no success); V tails (1 of 2); sign 0: y = 1. gap = 1·1·2 - 1 = 1, chance e^-(1/8): 7 of 8 keeps it.
    expect(drawDiscreteGaussian(Fraction.one, new BitSource(givenBytes(1, 1, 1, 0, 7)))).toBe(1n)
    // 0 of 8 succeeds, 15 of 16 ends it: turned away; then U = 0, V tails, sign 0: y = 0, gap = -1, 7 of 8 keeps it.
    expect(drawDiscreteGaussian(Fraction.one, new BitSource(givenBytes(1, 1, 1, 0, 0, 15, 0, 1, 0, 7)))).toBe(0n)
  })

  test.each([
    ['25/4', 8],
    ['1', 2],
    ['1/4', 1],
    ['100', 30],
  ])('of parameter %s follows its exact law', (text, reach) => {
    const variance = Fraction.parseRatio(text)
    const sample = many(`gaussian ${text}`, (bits) => drawDiscreteGaussian(variance, bits))
    const { statistic, critical } = chiSquare(sample, gaussianLaw(variance.toApproximate()), reach)
    expect(statistic).toBeLessThan(critical)
  })

  test('has the variance of its law', () => {
    const { mean, variance } = momentsOf(many('gaussian moments', (bits) => drawDiscreteGaussian(Fraction.make(25n, 4n), bits)))
    expect(Math.abs(mean)).toBeLessThan(4 * Math.sqrt(6.25 / draws))
    expect(Math.abs(variance / 6.25 - 1)).toBeLessThan(0.04)
  })

  test('of an off parameter, or of plain Laplace shape, would be caught', () => {
    const law = gaussianLaw(6.25)
    const wide = chiSquare(
      many('gaussian fault', (bits) => drawDiscreteGaussian(Fraction.make(27n, 4n), bits)),
      law,
      8,
    )
    expect(wide.statistic).toBeGreaterThan(wide.critical)
    const shape = chiSquare(
      many('gaussian shape', (bits) => drawDiscreteLaplace(Fraction.make(9n, 5n), bits)),
      law,
      8,
    )
    expect(shape.statistic).toBeGreaterThan(shape.critical)
  })

  test.each(['1e30', '1e-30'])('of parameter %s is drawn in time', (text) => {
    const bits = new BitSource(seededBytes(text))
    const sample = Array.from({ length: 500 }, () => drawDiscreteGaussian(Fraction.parse(text), bits))
    const { variance } = momentsOf(sample)
    if (text === '1e-30') expect(sample.every((value) => value === 0n)).toBe(true)
    else expect(Math.abs(variance / 1e30 - 1)).toBeLessThan(0.3)
  })
})
