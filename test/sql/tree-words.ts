import fc from 'fast-check'
import type { Constant, Name } from '../../src/sql/tree.ts'

/** An identifier: plain, a keyword, or one that needs quotes. */
export const word = fc.oneof(
  { weight: 6, arbitrary: fc.constantFrom('a', 'b', 'trips', 'rider_id', 'x1', '_y') },
  {
    weight: 2,
    arbitrary: fc.constantFrom(
      'select',
      'user',
      'Mixed',
      'with space',
      'quo"te',
      'é',
      'rows',
      'cube',
      'recursive',
      'text',
      'day',
      'partition',
      'temp',
      '1st',
      'a.b',
      "it's",
      'position',
      'E',
      'x',
      '😀',
    ),
  },
  { weight: 1, arbitrary: fc.string({ minLength: 1, maxLength: 8 }).filter((text) => !text.includes('\0')) },
)
/** A name of one part or two. */
export const name: fc.Arbitrary<Name> = fc.oneof({ weight: 3, arbitrary: fc.tuple(word) }, fc.tuple(word, word))
const symbol = fc.constantFrom(
  '+',
  '-',
  '*',
  '/',
  '%',
  '^',
  '=',
  '<>',
  '<',
  '>',
  '<=',
  '>=',
  '||',
  '->',
  '->>',
  '@>',
  '&&',
  '~',
  '!~',
  '|',
  '&',
  '#',
  '<<',
  '~~',
  '?',
  '@',
  '!!',
  '|/',
)
/** An operator, qualified or not. */
export const operator: fc.Arbitrary<Name> = fc.oneof({ weight: 6, arbitrary: fc.tuple(symbol) }, fc.tuple(word, symbol))
const text = fc
  .oneof(fc.string({ maxLength: 12 }), fc.constantFrom('', "'", "''", '\\', "\\'", '\n', '$$', '--', '/*', '%', 'é😀', '"', 'E', '\r\n', '\u2028'))
  .map((value) => value.replaceAll('\0', ''))

/** A constant of every kind. */
export const constant: fc.Arbitrary<Constant> = fc.oneof(
  fc.nat({ max: 2147483647 }).map((value) => ({ kind: 'integer', value: String(value) }) as const),
  fc
    .constantFrom('1.5', '.5', '5.', '1e3', '2147483648', '99999999999999999999', '1_000.5', '1e-7', '0.0')
    .map((value) => ({ kind: 'decimal', value }) as const),
  text.map((value) => ({ kind: 'string', value }) as const),
  fc.constantFrom('b', 'b0101', 'x1F', 'x').map((value) => ({ kind: 'bits', value }) as const),
  fc.boolean().map((value) => ({ kind: 'boolean', value }) as const),
  fc.constant({ kind: 'null' } as const),
)
