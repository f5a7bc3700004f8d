import { call, cast, constant, extreme, integer, isNull, logic, nothing, operator, text } from '../build.ts'
import { argument as arg, type Form, wordAt } from './form.ts'

const binary = (name: string, sql: string, total: string): Form => ({ sql, total, strict: true, print: (a) => operator(arg(a, 0), name, arg(a, 1)) })
const compared = (name: string): Form =>
  binary(name, `a ${name} b`, 'comparison of two values of one family; operands of two number types are compared in a type that holds both')
const exact = 'operands carry proved ranges and the plan proves that the result fits the type it is computed in'
const inside = 'the argument is clamped to the policy range, whose two ends were computed in the lobby before the debit'

/** Every form that may be printed over private rows. */
export const forms = {
  // comparison
  '=': compared('='),
  '<>': compared('<>'),
  '<': compared('<'),
  '<=': compared('<='),
  '>': compared('>'),
  '>=': compared('>='),
  distinct: {
    sql: 'a IS DISTINCT FROM b',
    total: 'as = over non-null operands',
    strict: false,
    print: (a) => ({ kind: 'distinct', name: ['='], left: arg(a, 0), right: arg(a, 1), negated: false, at: -1 }),
  },
  'not-distinct': {
    sql: 'a IS NOT DISTINCT FROM b',
    total: 'as = over non-null operands',
    strict: false,
    print: (a) => ({ kind: 'distinct', name: ['='], left: arg(a, 0), right: arg(a, 1), negated: true, at: -1 }),
  },
  in: {
    sql: 'a IN (b, c, …)',
    total: 'as = for each entry',
    strict: false,
    print: (a) => ({ kind: 'in-list', arg: arg(a, 0), list: a.slice(1), negated: false, at: -1 }),
  },
  'not-in': {
    sql: 'a NOT IN (b, c, …)',
    total: 'as = for each entry',
    strict: false,
    print: (a) => ({ kind: 'in-list', arg: arg(a, 0), list: a.slice(1), negated: true, at: -1 }),
  },
  // logic
  and: { sql: 'a AND b', total: 'three-valued logic', strict: false, print: (a) => logic('and', a) },
  or: { sql: 'a OR b', total: 'three-valued logic', strict: false, print: (a) => logic('or', a) },
  not: { sql: 'NOT a', total: 'three-valued logic', strict: true, print: (a) => ({ kind: 'not', arg: arg(a, 0), at: -1 }) },
  'is-null': { sql: 'a IS NULL', total: 'a test', strict: false, print: (a) => isNull(arg(a, 0)) },
  'is-not-null': { sql: 'a IS NOT NULL', total: 'a test', strict: false, print: (a) => isNull(arg(a, 0), true) },
  'is-boolean': {
    sql: 'a IS [NOT] TRUE, FALSE, UNKNOWN',
    total: 'a test',
    strict: false,
    print: (a, w) => {
      const test = wordAt(w, 0)
      if (test !== 'true' && test !== 'false' && test !== 'unknown') throw new RangeError('no such test')
      return { kind: 'is-boolean', arg: arg(a, 0), test, negated: wordAt(w, 1) === 'not', at: -1 }
    },
  },
  // conditional
  case: {
    sql: 'CASE WHEN a THEN b … ELSE c END',
    total: 'every branch is total by itself',
    strict: false,
    print: (a) => {
      const whens = []
      for (let i = 0; i + 1 < a.length; i += 2) whens.push({ when: arg(a, i), then: arg(a, i + 1) })
      return { kind: 'case', arg: null, whens, otherwise: a.length % 2 === 1 ? arg(a, a.length - 1) : null, at: -1 }
    },
  },
  coalesce: { sql: 'coalesce(a, b, …)', total: 'every argument is total by itself', strict: false, print: (a) => ({ kind: 'coalesce', args: a, at: -1 }) },
  greatest: { sql: 'greatest(a, b, …)', total: 'comparison', strict: false, print: (a) => extreme('greatest', ...a) },
  least: { sql: 'least(a, b, …)', total: 'comparison', strict: false, print: (a) => extreme('least', ...a) },
  nullif: {
    sql: 'nullif(a, b)',
    total: 'comparison',
    strict: false,
    print: (a) => ({ kind: 'nullif', name: ['='], left: arg(a, 0), right: arg(a, 1), at: -1 }),
  },
  // numbers
  add: binary('+', 'a + b', exact),
  subtract: binary('-', 'a - b', exact),
  multiply: binary('*', 'a * b', exact),
  divide: {
    sql: 'a / b',
    total: 'a zero divisor gives NULL; operands carry proved ranges, the divisor a proved grid, and the result fits',
    strict: true,
    print: (a) => operator(arg(a, 0), '/', { kind: 'nullif', name: ['='], left: arg(a, 1), right: integer(0n), at: -1 }),
  },
  modulo: {
    sql: 'a % b, mod(a, b)',
    total: 'a zero divisor gives NULL; integers with proved ranges',
    strict: true,
    print: (a) => operator(arg(a, 0), '%', { kind: 'nullif', name: ['='], left: arg(a, 1), right: integer(0n), at: -1 }),
  },
  negate: { sql: '- a', total: exact, strict: true, print: (a) => operator(null, '-', arg(a, 0)) },
  abs: { sql: 'abs(a), @ a', total: exact, strict: true, print: (a) => call('abs', [arg(a, 0)]) },
  floor: { sql: 'floor(a)', total: 'computed in numeric over a proved range', strict: true, print: (a) => call('floor', [arg(a, 0)]) },
  ceil: { sql: 'ceil(a), ceiling(a)', total: 'computed in numeric over a proved range', strict: true, print: (a) => call('ceil', [arg(a, 0)]) },
  round: {
    sql: 'round(a), round(a, n)',
    total: 'computed in numeric over a proved range, n a constant from 0 to 12',
    strict: true,
    print: (a, w) => call('round', [arg(a, 0), integer(BigInt(wordAt(w, 0)))]),
  },
  trunc: {
    sql: 'trunc(a), trunc(a, n)',
    total: 'computed in numeric over a proved range, n a constant from 0 to 12',
    strict: true,
    print: (a, w) => call('trunc', [arg(a, 0), integer(BigInt(wordAt(w, 0)))]),
  },
  sign: { sql: 'sign(a)', total: 'computed in numeric over a proved range', strict: true, print: (a) => call('sign', [arg(a, 0)]) },
  // casts: one form for all, as only total pairs are resolved to it
  cast: {
    sql: 'CAST(a AS type)',
    total:
      'only pairs that cannot raise: widening of numbers, numbers within a proved range of the target, any scalar to text, boolean and integer, dates and times within their clamp',
    strict: true,
    print: (a, w) => cast(arg(a, 0), wordAt(w, 1), wordAt(w, 0)),
  },
  truth: { sql: 'integer::boolean', total: 'a comparison with zero', strict: true, print: (a) => operator(arg(a, 0), '<>', integer(0n)) },
  'truth-number': {
    sql: 'boolean::integer',
    total: 'two constants',
    strict: true,
    print: (a) => ({
      kind: 'case',
      arg: null,
      whens: [
        { when: arg(a, 0), then: integer(1n) },
        { when: { kind: 'not', arg: arg(a, 0), at: -1 }, then: integer(0n) },
      ],
      otherwise: nothing(),
      at: -1,
    }),
  },
  // text
  like: {
    sql: 'a LIKE pattern',
    total: 'the pattern is the statement’s own and does not end in an escape',
    strict: true,
    print: (a, w) => ({
      kind: 'like',
      arg: arg(a, 0),
      pattern: arg(a, 1),
      word: wordAt(w, 0) === 'ilike' ? 'ilike' : 'like',
      operator: [`${wordAt(w, 1) === 'not' ? '!' : ''}~~${wordAt(w, 0) === 'ilike' ? '*' : ''}`],
      negated: wordAt(w, 1) === 'not',
      at: -1,
    }),
  },
  concat: {
    sql: 'a || b',
    total: 'each side is cut to 10,000 characters, so that no text can outgrow the server',
    strict: true,
    print: (a) => operator(call('left', [arg(a, 0), integer(10000n)]), '||', call('left', [arg(a, 1), integer(10000n)])),
  },
  lower: { sql: 'lower(a)', total: 'cut to 10,000 characters first', strict: true, print: (a) => call('lower', [call('left', [arg(a, 0), integer(10000n)])]) },
  upper: { sql: 'upper(a)', total: 'cut to 10,000 characters first', strict: true, print: (a) => call('upper', [call('left', [arg(a, 0), integer(10000n)])]) },
  btrim: { sql: 'trim(a), btrim(a)', total: 'only shortens', strict: true, print: (a) => call('btrim', [arg(a, 0)]) },
  ltrim: { sql: 'ltrim(a)', total: 'only shortens', strict: true, print: (a) => call('ltrim', [arg(a, 0)]) },
  rtrim: { sql: 'rtrim(a)', total: 'only shortens', strict: true, print: (a) => call('rtrim', [arg(a, 0)]) },
  length: { sql: 'length(a), char_length(a)', total: 'a count', strict: true, print: (a) => call('length', [arg(a, 0)]) },
  left: {
    sql: 'left(a, n)',
    total: 'n is a constant from -1000 to 1000',
    strict: true,
    print: (a, w) => call('left', [arg(a, 0), cast(text(wordAt(w, 0)), 'int4')]),
  },
  right: {
    sql: 'right(a, n)',
    total: 'n is a constant from -1000 to 1000',
    strict: true,
    print: (a, w) => call('right', [arg(a, 0), cast(text(wordAt(w, 0)), 'int4')]),
  },
  substring: {
    sql: 'substring(a, from, for), substr(a, from, for)',
    total: 'from and for are constants, for not negative',
    strict: true,
    print: (a, w) => call('substr', [arg(a, 0), cast(text(wordAt(w, 0)), 'int4'), ...(w.length > 1 ? [cast(text(wordAt(w, 1)), 'int4')] : [])]),
  },
  // dates and times
  'date-trunc': {
    sql: 'date_trunc(unit, a)',
    total: `${inside}; the unit is a constant of the list`,
    strict: true,
    print: (a, w) => call('date_trunc', [text(wordAt(w, 0)), arg(a, 0)]),
  },
  extract: {
    sql: 'extract(field FROM a), date_part(field, a)',
    total: `${inside}; the field is a constant of the list`,
    strict: true,
    print: (a, w) => call(wordAt(w, 1), [text(wordAt(w, 0)), arg(a, 0)]),
  },
  shift: { sql: 'a + interval, a - interval, date + n', total: inside, strict: true, print: (a, w) => operator(arg(a, 0), wordAt(w, 0), arg(a, 1)) },
  'days-between': { sql: 'date - date', total: 'both dates are finite, being clamped', strict: true, print: (a) => operator(arg(a, 0), '-', arg(a, 1)) },
  'time-between': {
    sql: 'timestamp - timestamp',
    total: 'both instants are finite, being clamped',
    strict: true,
    print: (a) => operator(arg(a, 0), '-', arg(a, 1)),
  },
  true: { sql: 'true', total: 'a constant', strict: false, print: () => constant({ kind: 'boolean', value: true }) },
} as const satisfies Readonly<Record<string, Form>>

export type FormName = keyof typeof forms

/** The row of that name; an unknown name is our own bug. */
export function formOf(name: string): Form {
  const form = (forms as Readonly<Record<string, Form>>)[name]
  if (form === undefined) throw new RangeError(`no form ${name}`)
  return form
}
