import { call, cast, column, constant, extreme, integer, isNull, logic, numeric, nothing, operator, text, when } from '../catalog/build.ts'
import { formOf } from '../catalog/functions/forms.ts'
import { type Clamp, isFixed, type Scalar } from '../catalog/scalar.ts'
import { isNumber } from '../catalog/scalar-type.ts'
import { printExpr } from '../sql/print.ts'
import type { Expr } from '../sql/tree.ts'

/** Values the lobby computed for column-free expressions, by their printed form. */
export type FixedValues = ReadonlyMap<string, string | null>

export const noFixedValues: FixedValues = new Map()

/** The name a scan is printed under. */
export function scanName(index: number): string {
  return `s${index.toString()}`
}

/** A scalar as SQL of ours. Column-free expressions become the constants that the lobby made of them. */
export function printScalar(scalar: Scalar, fixed: FixedValues): Expr {
  const node = scalar.node
  switch (node.kind) {
    case 'column': {
      const raw = column(scanName(node.scan), node.column)
      return node.clamped === null ? raw : printClamped(raw, scalar, node.clamped)
    }
    case 'constant':
      return printConstant(scalar, node.text)
    case 'parameter':
      return cast({ kind: 'parameter', number: node.number, at: -1 }, scalar.type.name, scalar.type.schema)
    case 'apply': {
      if (isFixed(scalar) && fixed.size > 0) {
        const key = fixedKey(scalar)
        const value = fixed.get(key)
        if (value !== undefined) return printConstant(scalar, value)
      }
      return formOf(node.form).print(
        node.args.map((arg) => printScalar(arg, fixed)),
        node.words,
      )
    }
  }
}

/** What names a column-free expression among the values the lobby computes. */
export function fixedKey(scalar: Scalar): string {
  return printExpr(printScalar(scalar, noFixedValues))
}

function printConstant(scalar: Scalar, value: string | null): Expr {
  const type = scalar.carrier === 'own' ? scalar.type : { schema: 'pg_catalog', name: scalar.carrier, family: scalar.type.family }
  const name = type.family === 'unknown' ? 'text' : type.name
  if (value === null) return cast(nothing(), name, type.schema)
  if (type.family === 'bool' && (value === 'true' || value === 'false')) return constant({ kind: 'boolean', value: value === 'true' })
  if (name === 'int4' && /^\d{1,9}$/.test(value)) return integer(BigInt(value))
  return cast(text(value), name, type.schema)
}

/** The column within its clamp. LEAST and GREATEST skip NULL, and NaN sorts above everything: both are taken out first. */
function printClamped(raw: Expr, scalar: Scalar, clamp: Clamp): Expr {
  const { name, schema, family } = scalar.type
  const literal = (value: string): Expr => (name === 'int4' && /^\d{1,9}$/.test(value) ? integer(BigInt(value)) : cast(text(value), name, schema))
  const inside = extreme('greatest', literal(clamp.low), extreme('least', literal(clamp.high), raw))
  if (!isNumber(scalar.type) || family === 'integer') {
    const value = clamp.step !== null && scalar.carrier === 'numeric' ? onGrid(cast(inside, 'numeric'), clamp.step) : inside
    return scalar.nullable ? when(isNull(raw), nothing(), value) : value
  }
  // a float comes to numeric with 6 or 15 digits, which may lie beyond the clamp that the float kept to
  const exact = family === 'float' ? extreme('greatest', numeric(clamp.low), extreme('least', numeric(clamp.high), cast(inside, 'numeric'))) : inside
  const value = clamp.step === null ? exact : onGrid(exact, clamp.step)
  return when(logic('or', [isNull(raw), operator(raw, '=', cast(text('NaN'), name))]), nothing(), value)
}

/** The nearest multiple of the step. */
function onGrid(value: Expr, step: string): Expr {
  return operator(call('round', [operator(value, '/', numeric(step))]), '*', numeric(step))
}

/** The value in its own type, where it was computed in a wider one. */
export function printOwn(scalar: Scalar, fixed: FixedValues): Expr {
  const printed = printScalar(scalar, fixed)
  return scalar.carrier === 'own' || scalar.carrier === scalar.type.name ? printed : cast(printed, scalar.type.name, scalar.type.schema)
}

/** A key in canonical form: equal values print alike. */
export function printKey(scalar: Scalar, fixed: FixedValues): Expr {
  const own = printOwn(scalar, fixed)
  if (scalar.type.family === 'numeric') return call('trim_scale', [own])
  if (scalar.type.family === 'float') return operator(own, '+', cast(text('0'), scalar.type.name))
  if (scalar.type.family === 'unknown') return cast(own, 'text')
  return own
}
