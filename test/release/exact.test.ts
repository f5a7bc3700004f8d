import { inspect } from 'node:util'
import { describe, expect, test } from 'vitest'
import { debitFrom } from '../../src/budget/debit.ts'
import type { Debit } from '../../src/budget/debit.ts'
import { exactRow, openExact, sealExact } from '../../src/release/exact.ts'

function paid(id = 'd1'): Debit {
  return debitFrom({ kind: 'debited', id, balances: [] })
}

const rows = [exactRow(['Saltmarsh', null, '4711', '-12'], 2, 2)]

describe('an exact table', () => {
  test('gives its rows to one opener, against a debit', () => {
    const table = sealExact(rows)
    expect(openExact(table, paid('d7'))).toEqual({ debit: 'd7', totals: [{ keys: ['Saltmarsh', null], values: [4711n, -12n] }] })
    expect(() => openExact(table, paid())).toThrow('an exact table is opened once')
  })

  test('stays closed to a debit that was used before', () => {
    const debit = paid()
    openExact(sealExact(rows), debit)
    expect(() => openExact(sealExact(rows), debit)).toThrow('a debit pays for one release')
  })

  test('shows nothing to inspection, spread, cloning, keys and descriptors', () => {
    const table = sealExact(rows)
    const shown = [
      inspect(table, { showHidden: true, depth: 9 }),
      inspect({ table }),
      JSON.stringify({ ...table }),
      JSON.stringify(structuredClone(table)),
      JSON.stringify(Object.getOwnPropertyDescriptors(table)),
      Reflect.ownKeys(table).map(String).join(),
    ].join()
    expect(shown).not.toMatch(/4711|Saltmarsh/)
  })

  test('is not turned into text, JSON or a number', () => {
    const table: unknown = sealExact(rows)
    expect(() => JSON.stringify({ table })).toThrow('not printed')
    expect(() => `${table as string}`).toThrow('not printed')
    expect(() => Number(table)).toThrow('not printed')
  })
})

describe('a row of the vault', () => {
  test('keeps integers of any size to the last digit', () => {
    const big = `-${'1234567890'.repeat(20)}`
    expect(exactRow([big], 0, 1).values[0]?.toString()).toBe(big)
  })

  test.each([['1.5'], ['1e3'], ['NaN'], ['Infinity'], [''], [' 1'], ['0x10'], [null]])(
    'with the total %s is our mistake, and the message does not quote it',
    (total) => {
      expect(() => exactRow(['key', total], 1, 1)).toThrow(/^a total of the vault is an integer$/)
    },
  )

  test('with a column too many or too few is our mistake', () => {
    expect(() => exactRow(['1', '2'], 0, 1)).toThrow('keys and its totals')
    expect(() => exactRow([], 0, 1)).toThrow('keys and its totals')
  })
})
