import { refuse } from '../base/refusal.ts'
import { inList } from '../catalog/functions/comparisons.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { scalarType } from '../catalog/scalar-type.ts'
import type { Expr } from '../sql/tree.ts'
import type { Context } from './context.ts'
import { fixedValue, lowerParameter } from './lower-constant.ts'

/** a = ANY (ARRAY[…]), and a = ANY ($1) with an array for a parameter, as drivers send lists. */
export function lowerAny(expr: Extract<Expr, { kind: 'quantified' }>, lower: (each: Expr) => Scalar, context: Context): Scalar {
  const form = { what: 'this form of ANY or ALL' }
  if (expr.all || expr.name.at(-1) !== '=') return refuse('expr.unsupported', form, expr.at)
  const arg = lower(expr.left)
  const right = uncast(expr.right)
  if (right.kind === 'array') return inList(arg, right.items.map(lower), false, expr.at)
  const parameter = right.kind === 'parameter' ? context.parameters[right.number - 1] : undefined
  if (right.kind !== 'parameter' || parameter === undefined || !parameter.type.name.startsWith('_')) return refuse('expr.unsupported', form, expr.at)
  const element = scalarType(parameter.type.name.slice(1))
  if (parameter.value === undefined) return inList(arg, [lowerParameter({ type: element, value: undefined }, right.number, right.at)], false, expr.at)
  if (parameter.value === null) return fixedValue(scalarType('bool'), null, expr.at)
  const items = readItems(parameter.value) ?? refuse('expr.unsupported', { what: 'a parameter that is an array of arrays' }, right.at)
  // compared as the list it stands for, so that what could not be compared is refused whatever its length
  inList(arg, [lowerParameter({ type: element, value: undefined }, right.number, right.at)], false, expr.at)
  if (items.length === 0) return fixedValue(scalarType('bool'), 'false', expr.at)
  return inList(
    arg,
    items.map((item) => fixedValue(element, item, right.at)),
    false,
    expr.at,
  )
}

/** The expression without the casts around it, where it is a parameter: its type was described with them. */
function uncast(expr: Expr): Expr {
  if (expr.kind !== 'cast') return expr
  const inner = uncast(expr.arg)
  return inner.kind === 'parameter' ? inner : expr
}

/** The items of a JSON array of scalars, numbers as the text they are written in (JSON.parse would round them); null for a nested one. */
function readItems(json: string): readonly (string | null)[] | null {
  const quoted = json.replace(/"(?:[^"\\]|\\.)*"|-?\d[\d.eE+-]*/g, (token) => (token.startsWith('"') ? token : `"${token}"`))
  const items: unknown = JSON.parse(quoted)
  if (!Array.isArray(items)) return null
  const texts = items.map((item: unknown) => (item === null ? null : typeof item === 'string' || typeof item === 'boolean' ? String(item) : undefined))
  return texts.every((text) => text !== undefined) ? texts : null
}
