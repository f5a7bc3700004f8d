import { refuse } from '../base/refusal.ts'
import { clamped } from '../catalog/functions/clamped.ts'
import { absolute, arithmetic, rounded } from '../catalog/functions/numbers.ts'
import { textFunction } from '../catalog/functions/texts.ts'
import { dateTrunc, extract } from '../catalog/functions/times.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { isNumber } from '../catalog/scalar-type.ts'
import type { Call } from '../sql/tree.ts'
import type { Context } from './context.ts'
import { lowerNow } from './lower-value-function.ts'

const nows: ReadonlySet<string> = new Set(['now', 'transaction_timestamp'])

/** A function call over private rows: only the functions of the table, in the forms that cannot raise. */
export function lowerCall(call: Call, args: readonly Scalar[], context: Context): Scalar {
  const name = call.name.at(-1) ?? ''
  const written = call.name.join('.')
  if (call.name.length > 1 && call.name[0] !== 'pg_catalog') refuse('expr.function', { what: written }, call.at)
  if (call.star || call.distinct || call.variadic || call.within || call.order.length > 0 || call.filter !== null)
    refuse('expr.function', { what: written }, call.at)
  const [first, second] = args
  if (nows.has(name) && first === undefined) return lowerNow(context, call.at)
  if (first !== undefined && second !== undefined && args.length === 2) {
    if (name === 'date_trunc') return dateTrunc(word(first, 'date_trunc', call.at), second, call.at)
    if (name === 'extract' || name === 'date_part') return extract(word(first, name, call.at), second, name, call.at)
    if (name === 'mod' && isNumber(first.type) && isNumber(second.type)) return arithmetic('%', clamped(first), clamped(second), call.at)
    if ((name === 'round' || name === 'trunc') && isNumber(first.type)) return rounded(name, clamped(first), places(second, call.at), call.at)
  }
  if (first !== undefined && args.length === 1 && isNumber(first.type)) {
    const value = clamped(first)
    if (name === 'abs') return absolute(value, call.at)
    if (name === 'floor' || name === 'round' || name === 'trunc' || name === 'sign') return rounded(name, value, 0, call.at)
    if (name === 'ceil' || name === 'ceiling') return rounded('ceil', value, 0, call.at)
  }
  return textFunction(name, args, call.at) ?? refuse('expr.function', { what: written }, call.at)
}

function word(arg: Scalar, name: string, at: number): string {
  return arg.node.kind === 'constant' && arg.node.text !== null
    ? arg.node.text
    : refuse('expr.unsupported', { what: `${name} with a unit that is not a constant` }, at)
}

function places(arg: Scalar, at: number): number {
  const text = arg.node.kind === 'constant' ? (arg.node.text ?? '') : ''
  return /^([0-9]|1[0-2])$/.test(text)
    ? Array.from({ length: 13 }, (_, i) => i).findIndex((i) => i.toString() === text)
    : refuse('expr.unsupported', { what: 'rounding to a number of places that is not a constant from 0 to 12' }, at)
}
