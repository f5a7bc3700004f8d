import { refuse } from '../base/refusal.ts'
import { clamped } from '../catalog/functions/clamped.ts'
import { compare, settle } from '../catalog/functions/comparisons.ts'
import { absolute, arithmetic, negate } from '../catalog/functions/numbers.ts'
import { concat } from '../catalog/functions/texts.ts'
import { daysBetween, shift, timeBetween } from '../catalog/functions/times.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { isNumber, scalarType } from '../catalog/scalar-type.ts'
import type { Expr } from '../sql/tree.ts'
import { fixedValue } from './lower-constant.ts'

const instants: ReadonlySet<string> = new Set(['date', 'timestamp', 'timestamptz'])

/** An operator over private rows. */
export function lowerOperator(expr: Extract<Expr, { kind: 'operator' }>, left: Scalar | null, right: Scalar): Scalar {
  const sign = expr.name.at(-1) ?? ''
  const at = expr.at
  if (expr.name.length > 1 && expr.name[0] !== 'pg_catalog') refuse('expr.function', { what: expr.name.join('.') }, at)
  if (left === null) return prefix(sign, right, at)
  switch (sign) {
    case '=':
    case '<>':
    case '<':
    case '<=':
    case '>':
    case '>=':
      return compare(sign, left, right, at)
    case '!=':
      return compare('<>', left, right, at)
    case '||':
      return concat(left, right, at)
    case '+':
    case '-':
    case '*':
    case '/':
    case '%':
      return compute(sign, left, right, at)
    default:
      return refuse('expr.unsupported', { what: `the operator ${sign}` }, at)
  }
}

function prefix(sign: string, value: Scalar, at: number): Scalar {
  if (sign === '-' && value.node.kind === 'constant' && value.node.text !== null && isNumber(value.type)) {
    const text = value.node.text.startsWith('-') ? value.node.text.slice(1) : `-${value.node.text}`
    return fixedValue(value.type, text, at)
  }
  if (!isNumber(value.type)) refuse('expr.unsupported', { what: `${sign} over ${value.type.name}` }, at)
  if (sign === '-') return negate(clamped(value), at)
  if (sign === '+') return value
  if (sign === '@') return absolute(clamped(value), at)
  return refuse('expr.unsupported', { what: `the operator ${sign}` }, at)
}

function compute(sign: '+' | '-' | '*' | '/' | '%', left: Scalar, right: Scalar, at: number): Scalar {
  const [a, b] = [settle(left, partner(right)), settle(right, partner(left))]
  if (isNumber(a.type) && isNumber(b.type)) return arithmetic(sign, clamped(a), clamped(b), at)
  if (sign === '+' || sign === '-') {
    if (instants.has(a.type.family)) {
      if (b.type.family === 'interval' || (a.type.family === 'date' && b.type.family === 'integer')) return shift(sign, a, b, at)
      if (sign === '-' && a.type.family === 'date' && b.type.family === 'date') return daysBetween(a, b, at)
      if (sign === '-' && a.type.family === b.type.family) return timeBetween(a, b, at)
    }
    if (sign === '+' && instants.has(b.type.family) && (a.type.family === 'interval' || (b.type.family === 'date' && a.type.family === 'integer')))
      return shift('+', b, a, at)
    if (a.type.family === 'interval' && b.type.family === 'interval') refuse('expr.unsupported', { what: 'interval arithmetic' }, at)
  }
  return refuse('expr.unsupported', { what: `${sign} between ${a.type.name} and ${b.type.name}` }, at)
}

/** What a bare string beside it is read as: beside a date or an instant, PostgreSQL tries the same type first. */
function partner(other: Scalar): Scalar['type'] {
  return other.type.family === 'unknown' ? scalarType('text') : other.type
}
