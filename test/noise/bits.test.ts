import { describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { BitSource } from '../../src/noise/bits.ts'
import { criticalAt } from './goodness.ts'
import { givenBytes, seededBytes } from './seeded-bytes.ts'

describe('the bit source', () => {
  test('cuts the surplus bits off and draws again while the value is not below the bound', () => {
    const bits = new BitSource(givenBytes(0b11111_110, 0b10101_101, 0b00000_011))
    expect(bits.below(5n)).toBe(3n) // 6 and 5 are drawn again
    expect(new BitSource(givenBytes(0xff, 0xfe, 0x12, 0x34)).below(0x1235n)).toBe(0x1234n) // 0x1ffe is drawn again
    expect(new BitSource(givenBytes(0x01, 0x02, 0x03)).below(1n << 24n)).toBe(0x010203n)
    expect(new BitSource(givenBytes(0xff)).below(256n)).toBe(255n)
  })

  test('takes no byte where there is nothing to choose', () => {
    const bits = new BitSource(givenBytes(7))
    expect(bits.below(1n)).toBe(0n)
    expect(bits.below(8n)).toBe(7n)
  })

  test('asks for bytes in batches and uses none twice', () => {
    const asked: number[] = []
    const bits = new BitSource((count) => {
      asked.push(count)
      return new Uint8Array(count).fill(asked.length)
    })
    const drawn = Array.from({ length: 4097 }, () => bits.below(256n))
    expect(asked).toEqual([4096, 4096])
    expect(drawn.slice(0, 4096).every((value) => value === 1n)).toBe(true)
    expect(drawn[4096]).toBe(2n)
  })

  test.each([3n, 10n, 256n, 1000n])('is uniform below %s', (n) => {
    const bits = new BitSource(seededBytes(`uniform ${n}`))
    const cells = new Array<number>(Number(n)).fill(0)
    const draws = Number(n) * 40
    for (let i = 0; i < draws; i++) cells[Number(bits.below(n))]! += 1
    const statistic = cells.reduce((sum, count) => sum + (count - 40) ** 2 / 40, 0)
    expect(statistic).toBeLessThan(criticalAt(cells.length - 1))
  })

  test('stops when the source gives too few bytes, or when there is no bound', () => {
    expect(() => new BitSource(() => new Uint8Array(3)).below(2n)).toThrow(BrokenCheck)
    expect(() => new BitSource(seededBytes('none')).below(0n)).toThrow(BrokenCheck)
  })
})
