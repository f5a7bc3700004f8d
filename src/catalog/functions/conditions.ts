import { refuse } from '../../base/refusal.ts'
import { Fraction } from '../../base/fraction.ts'
import type { Range, Scalar } from '../scalar.ts'
import { isNumber, promote, sameType, scalarType, type ScalarType } from '../scalar-type.ts'
import { apply } from './apply.ts'
import { clamped } from './clamped.ts'
import { commonType, compare, settle } from './comparisons.ts'
import { asNumeric, commonStep, comparable } from './numbers.ts'

const bool = scalarType('bool')

export function truth(arg: Scalar): Scalar {
  const settled = settle(arg, bool)
  if (settled.type.family !== 'bool') refuse('expr.unsupported', { what: `a condition of type ${settled.type.name}` }, arg.at)
  return settled
}

export function and(args: readonly Scalar[], at: number): Scalar {
  return apply('and', args.map(truth), bool, { at })
}

export function or(args: readonly Scalar[], at: number): Scalar {
  return apply('or', args.map(truth), bool, { at })
}

export function not(arg: Scalar, at: number): Scalar {
  return apply('not', [truth(arg)], bool, { at })
}

export function isNull(arg: Scalar, negated: boolean, at: number): Scalar {
  return apply(negated ? 'is-not-null' : 'is-null', [arg], bool, { at, nullable: false })
}

export function isBoolean(arg: Scalar, test: string, negated: boolean, at: number): Scalar {
  return apply('is-boolean', [truth(arg)], bool, { at, words: [test, negated ? 'not' : ''], nullable: false })
}

/** Values that become one: brought to one type, numbers clamped and, where their types differ, computed in numeric. */
function unify(
  values: readonly Scalar[],
  what: string,
): { readonly values: readonly Scalar[]; readonly type: ScalarType; readonly range: Range | null; readonly carrier: Scalar['carrier'] } {
  const first = commonType(values)
  const known = values.map((value) => clamped(settle(value, first)))
  const numbers = known.every((value) => isNumber(value.type))
  const type = numbers ? known.map((value) => value.type).reduce(promote) : first
  if (!numbers) {
    const odd = known.find((value) => !sameType(value.type, type) && !(value.type.family === 'text' && type.family === 'text'))
    if (odd !== undefined) refuse('expr.unsupported', { what: `${what} over ${type.name} and ${odd.type.name}` }, odd.at)
    const wide = type.family === 'text' ? scalarType('text') : type
    return { values: known, type: known.every((value) => sameType(value.type, type)) ? type : wide, range: null, carrier: 'own' }
  }
  const ranges = known.map((value) => (value.node.kind === 'constant' && value.node.text === null ? null : value.range))
  const present = known.filter((value) => !(value.node.kind === 'constant' && value.node.text === null))
  const proved = present.every((value) => value.range !== null)
  const range = proved ? ranges.reduce<Range | null>(union, null) : null
  const own = known.every((value) => value.carrier === 'own' && sameType(value.type, type))
  if (own) return { values: known, type, range, carrier: 'own' }
  if (!proved) {
    if (known.every((value) => value.carrier === 'own' && value.type.family !== 'numeric')) return { values: known, type, range: null, carrier: 'own' }
    refuse('expr.unbounded', { expression: 'this value' }, known[0]?.at ?? -1)
  }
  return { values: known.map(asNumeric), type, range, carrier: 'numeric' }
}

function union(a: Range | null, b: Range | null): Range | null {
  if (a === null) return b
  if (b === null) return a
  return { low: a.low.min(b.low), high: a.high.max(b.high), step: commonStep(a.step, b.step) }
}

/** CASE, its simple form rewritten to comparisons by the caller; a missing ELSE is NULL. */
export function choose(whens: readonly { readonly when: Scalar; readonly then: Scalar }[], otherwise: Scalar | null, at: number): Scalar {
  const results = [...whens.map((each) => each.then), ...(otherwise === null ? [] : [otherwise])]
  const unified = unify(results, 'CASE')
  const args = whens.flatMap((each, i) => {
    const then = unified.values[i]
    return then === undefined ? [] : [truth(each.when), then]
  })
  const last = unified.values[whens.length]
  const nullable = otherwise === null || results.some((result) => result.nullable)
  return { ...apply('case', last === undefined ? args : [...args, last], unified.type, { at, range: unified.range, nullable }), carrier: unified.carrier }
}

export function coalesce(args: readonly Scalar[], at: number): Scalar {
  const unified = unify(args, 'coalesce')
  return {
    ...apply('coalesce', unified.values, unified.type, { at, range: unified.range, nullable: unified.values.every((arg) => arg.nullable) }),
    carrier: unified.carrier,
  }
}

export function extreme(word: 'greatest' | 'least', args: readonly Scalar[], at: number): Scalar {
  const unified = unify(args, word)
  return {
    ...apply(word, unified.values, unified.type, { at, range: unified.range, nullable: unified.values.every((arg) => arg.nullable) }),
    carrier: unified.carrier,
  }
}

export function nullIf(left: Scalar, right: Scalar, at: number): Scalar {
  const value = clamped(settle(left, right.type))
  compare('=', value, right, at)
  const beside = settle(right, value.type)
  if (comparable(value, beside).some((side, i) => side !== [value, beside][i])) refuse('expr.unbounded', { expression: 'this value' }, at)
  return { ...apply('nullif', [value, settle(right, value.type)], value.type, { at, range: value.range, nullable: true }), carrier: value.carrier }
}

/** A boolean as 1 and 0. */
export function truthNumber(arg: Scalar, at: number): Scalar {
  return apply('truth-number', [arg], scalarType('int4'), { at, range: { low: Fraction.zero, high: Fraction.one, step: Fraction.one } })
}
