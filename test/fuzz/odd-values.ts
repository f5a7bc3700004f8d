import type { Random } from './random.ts'

/** A value in its type's input form, or NULL. */
export type Cell = string | null

/** By kind of column: a few values that tie again and again, and those that break careless SQL. */
export interface Pool {
  readonly usual: readonly string[]
  readonly odd: readonly string[]
}

const long = 'ferry '.repeat(3000)
const digits = '9'.repeat(131071)
const fine = `0.${'0'.repeat(16000)}7`

export const pools = {
  int2: { usual: ['0', '1', '1', '2', '3', '7'], odd: ['-32768', '32767', '-1'] },
  int4: { usual: ['0', '1', '2', '3', '5', '6', '12'], odd: ['-2147483648', '2147483647', '-1', '1000000'] },
  int8: { usual: ['0', '1', '2', '3'], odd: ['-9223372036854775808', '9223372036854775807', '9007199254740993', '9007199254740992', '1000000000000000000'] },
  numeric: {
    usual: ['0', '1', '1.0', '1.00', '2.5', '0.5', '-1.50'],
    odd: ['NaN', 'Infinity', '-Infinity', '1e300', '-1e300', '1e-300', digits, `-${digits}`, fine, '-0.0'],
  },
  scaled: { usual: ['0', '1', '1.0', '2.5', '0.5'], odd: ['NaN', '9999.9', '-9999.9'] },
  float4: { usual: ['0', '1', '-0', '0.5', '2.25', '16777216'], odd: ['NaN', 'Infinity', '-Infinity', '3.4e38', '1e-45', '-1e-45', '1234567', '0.1'] },
  float8: {
    usual: ['0', '-0', '0.5', '0.25', '1', '2'],
    odd: ['NaN', 'Infinity', '-Infinity', '1.7e308', '-1.7e308', '5e-324', '-5e-324', '1e-300', '9007199254740992', '0.1'],
  },
  bool: { usual: ['true', 'false'], odd: ['true'] },
  text: { usual: ['', 'a', 'A', 'b', 'fog', 'calm'], odd: [' ', 'a ', "o'b", 'back\\slash\\', '%_%', '\t\n', 'ß', 'İ', '🦭', 'NULL', long, `${long}x`] },
  caseless: { usual: ['a', 'A', 'b', 'B'], odd: ['', 'Ä', 'ß', 'ss'] },
  varchar: { usual: ['a', 'b', 'x'], odd: ['', 'x ', 'X', "';--"] },
  bpchar: { usual: ['a', 'b', 'x'], odd: ['', 'x  ', 'X'] },
  date: {
    usual: ['2025-01-31', '2025-02-28', '2025-03-01', '2025-12-31', '2026-06-15'],
    odd: ['infinity', '-infinity', '5874897-12-31', '4713-11-24 BC', '0001-01-01', '0044-03-15 BC', '1999-12-31'],
  },
  timestamp: {
    usual: ['2025-03-30 02:30:00', '2025-03-30 03:30:00', '2025-10-26 02:30:00', '2025-01-31 00:00:00', '2026-06-15 12:00:00.5'],
    odd: ['infinity', '-infinity', '294276-12-31 23:59:59.999999', '4713-11-24 00:00:00 BC', '0044-03-15 12:00 BC'],
  },
  timestamptz: {
    usual: ['2025-03-30 01:30:00+00', '2025-10-26 00:30:00+00', '2025-10-26 01:30:00+00', '2025-01-31 23:30:00+00', '2026-06-15 12:00:00.5+00'],
    odd: ['infinity', '-infinity', '294276-12-31 23:59:59.999999+00', '4713-11-24 00:00:00+00 BC', '0044-03-15 12:00+00 BC'],
  },
  time: { usual: ['00:00', '12:30', '23:59:59.999999'], odd: ['24:00'] },
  interval: { usual: ['1 month', '30 days', '24:00:00', '1 day', '0'], odd: ['-178000000 years', '178000000 years', '-1 day', 'infinity'] },
  uuid: { usual: ['00000000-0000-0000-0000-000000000000', '11111111-1111-1111-1111-111111111111'], odd: ['ffffffff-ffff-ffff-ffff-ffffffffffff'] },
  sky: { usual: ['fog', 'calm', 'gale'], odd: ['calm'] },
} as const satisfies Readonly<Record<string, Pool>>

export type Kind = keyof typeof pools

/** A value of a column: mostly one that ties, sometimes an odd one, sometimes NULL. */
export function cellOf(kind: Kind, nullable: boolean, random: Random): Cell {
  if (nullable && random.chance(0.12)) return null
  return random.chance(0.12) ? random.pick(pools[kind].odd) : random.pick(pools[kind].usual)
}

/** Persons by the type of their key; neighbours in a lossy comparison stand beside each other. */
export const personPools: Readonly<Record<string, readonly string[]>> = {
  int4: ['-2147483648', '-1', '0', '1', '2', '3', '5', '7', '16777216', '16777217', '2147483647'],
  int8: ['9007199254740992', '9007199254740993', '9007199254740994', '-9223372036854775808', '9223372036854775807', '0', '1', '2', '3', '5', '7'],
  text: ['', ' ', 'a', 'A', 'a ', "o'b", 'back\\', '%', 'ß', '🦭', 'x'],
  varchar: ['x', 'x ', 'X', '', 'a', 'b', 'fog', 'fog ', '1', '01', '-'],
  uuid: Array.from({ length: 11 }, (_, i) => `00000000-0000-4000-8000-0000000000${(i + 10).toString()}`),
  numeric: ['0', '1', '1.5', '-1.5', '9007199254740992', '9007199254740993', '123456789012345678.25', '123456789012345678.75', '3', '5', '7'],
}
