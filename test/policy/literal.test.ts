import { describe, expect, test } from 'vitest'
import type { CatalogType } from '../../src/catalog/catalog.ts'
import { compareDecimals } from '../../src/policy/decimal.ts'
import { readLiteral } from '../../src/policy/literal.ts'
import { numericShape } from '../../src/policy/type.ts'

const base = (name: string, printed = name, modifier = -1): CatalogType => ({ schema: 'pg_catalog', name, printed, modifier, kind: 'base', labels: [] })
/** The modifier of numeric(p,s): ((p << 16) | (s & 2047)) + 4. */
const numeric = (precision: number, scale: number): CatalogType => base('numeric', `numeric(${precision},${scale})`, ((precision << 16) | (scale & 2047)) + 4)
const weather: CatalogType = { schema: 'deck', name: 'weather', printed: 'deck.weather', modifier: -1, kind: 'enum', labels: ['fog', 'calm', 'true'] }

function text(type: CatalogType, written: string): string | null {
  const reading = readLiteral(type, written)
  return reading.kind === 'literal' ? reading.literal.text : null
}

describe('literals of a column’s type', () => {
  test.each([
    [base('int2'), '32767', '32767'],
    [base('int2'), '-32768', '-32768'],
    [base('int2'), '32768', null],
    [base('int4'), '1e3', '1000'],
    [base('int4'), '1.0', '1'],
    [base('int4'), '1.5', null],
    [base('int4'), '2147483648', null],
    [base('int8'), '-9223372036854775808', '-9223372036854775808'],
    [base('int8'), '9223372036854775808', null],
    [base('int8'), 'ten', null],
    [base('int8'), '1_000', null],
    [base('numeric'), '00.50', '0.5'],
    [base('numeric'), 'NaN', null],
    [numeric(5, 1), '9999.9', '9999.9'],
    [numeric(5, 1), '10000', null],
    [numeric(5, 1), '0.25', null],
    [numeric(3, -2), '99900', '99900'],
    [numeric(3, -2), '150', null],
    [numeric(2, 4), '0.0099', '0.0099'],
    [numeric(2, 4), '0.01', null],
    [base('float4'), '3.4e38', `34${'0'.repeat(37)}`],
    [base('float4'), '3.5e38', null],
    [base('float8'), '1e-320', null],
    [base('float8'), '-0.0', '0'],
    [base('float8'), 'Infinity', null],
    [base('bool'), 'TRUE', 'true'],
    [base('bool'), 'yes', null],
    [base('date'), '2024-02-29', '2024-02-29'],
    [base('date'), '2025-02-29', null],
    [base('date'), '1900-02-29', null],
    [base('date'), '0000-01-01', null],
    [base('date'), 'today', null],
    [base('date'), '31.12.2025', null],
    [base('timestamp'), '2025-01-31', '2025-01-31 00:00:00'],
    [base('timestamp'), '2025-01-31T08:30', '2025-01-31 08:30:00'],
    [base('timestamp'), '2025-01-31 08:30:00.250', '2025-01-31 08:30:00.25'],
    [base('timestamp'), '2025-01-31 08:30+01', null],
    [base('timestamp'), '2025-01-31 24:00', null],
    [base('timestamptz'), '2025-01-31', '2025-01-31 00:00:00+00'],
    [base('timestamptz'), '2025-01-31 00:30+01:00', '2025-01-30 23:30:00+00'],
    [base('timestamptz'), '1969-12-31T23:59:59.999999Z', '1969-12-31 23:59:59.999999+00'],
    [base('timestamptz'), '0001-01-01 00:00+01', null],
    [base('timestamptz'), '2025-01-31 08:30 Europe/Paris', null],
    [base('time'), '08:30', '08:30:00'],
    [base('time'), '8:30', null],
    [base('interval'), '90 minutes', '01:30:00'],
    [base('interval'), '-P1DT12H', '-36:00:00'],
    [base('interval'), '1 month', null],
    [base('interval'), 'P', null],
    [base('uuid'), 'A0EEBC99-9C0B-4EF8-BB6D-6BB9BD380A11', 'a0eebc99-9c0b-4ef8-bb6d-6bb9bd380a11'],
    [base('uuid'), 'a0eebc99', null],
    [base('varchar', 'character varying(4)', 8), 'émus', 'émus'],
    [base('varchar', 'character varying(4)', 8), 'gulls', null],
    [base('bpchar', 'character(4)', 8), 'ab  ', 'ab'],
    [weather, 'true', 'true'],
    [weather, 'storm', null],
    [base('json'), '1', null],
    [{ ...base('int4'), schema: 'deck' }, '1', null],
  ] as const)('%o %s → %s', (type, written, expected) => {
    expect(text(type, written)).toBe(expected)
  })

  test('are ordered as their type orders them', () => {
    const order = (type: CatalogType, written: string) => {
      const reading = readLiteral(type, written)
      if (reading.kind !== 'literal' || reading.literal.order === null) throw new Error(written)
      return reading.literal.order
    }
    for (const [type, less, more] of [
      [base('numeric'), '9.99', '10'],
      [base('float8'), '-2', '-1e-3'],
      [base('timestamptz'), '2025-01-01 00:30+01', '2025-01-01'],
      [base('interval'), '23:59', '1 day'],
    ] as const)
      expect(compareDecimals(order(type, less), order(type, more)) < 0n).toBe(true)
  })

  test('the modifier of numeric is read as PostgreSQL packs it', () => {
    expect([numericShape(numeric(10, 2)), numericShape(numeric(3, -2)), numericShape(numeric(1000, -1000)), numericShape(base('numeric'))]).toEqual([
      { precision: 10, scale: 2 },
      { precision: 3, scale: -2 },
      { precision: 1000, scale: -1000 },
      null,
    ])
  })
})
