import { Fraction } from '../../base/fraction.ts'
import { type Clamp, isFixed, parts, type Range, type Scalar } from '../scalar.ts'

/** The value clamped to what the policy declares, where it declares anything; wherever a bound is needed the clamp is taken on by itself. */
export function clamped(scalar: Scalar): Scalar {
  const node = scalar.node
  if (node.kind !== 'column' || node.clamped !== null || node.offers === null) return scalar
  const number = scalar.type.family === 'integer' || scalar.type.family === 'numeric' || scalar.type.family === 'float'
  const carrier = scalar.type.family === 'float' || onGrid(scalar, node.offers) ? 'numeric' : 'own'
  return {
    ...scalar,
    node: { ...node, clamped: node.offers },
    range: number ? rangeOfClamp(scalar, node.offers) : null,
    carrier,
    nullable: scalar.nullable || scalar.type.family === 'float' || scalar.type.family === 'numeric',
  }
}

/** Whether the printed clamp also rounds to the declared step: needed where the type itself proves no grid. */
export function onGrid(scalar: Scalar, clamp: Clamp): boolean {
  return (
    clamp.step !== null && (scalar.type.family === 'float' || scalar.type.family === 'numeric' || clamp.step !== '1') && (scalar.range?.step ?? null) === null
  )
}

function rangeOfClamp(scalar: Scalar, clamp: Clamp): Range {
  // only what is printed on the grid is on it: an integer column is clamped, never rounded to its step
  const step = scalar.type.family === 'integer' ? Fraction.one : clamp.step !== null ? Fraction.parse(clamp.step) : (scalar.range?.step ?? null)
  return { low: Fraction.parse(clamp.low), high: Fraction.parse(clamp.high), step }
}

/** Whether nothing in it can leave its clamp: it reads no column, or only clamped ones. */
export function isClamped(scalar: Scalar): boolean {
  if (isFixed(scalar)) return true
  for (const part of parts(scalar)) if (part.node.kind === 'column' && part.node.clamped === null) return false
  return true
}
