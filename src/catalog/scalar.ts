import type { Fraction } from '../base/fraction.ts'
import type { ScalarType } from './scalar-type.ts'

/**
 * An expression over private rows, typed, and total by construction: it can be made only by the table of functions in `functions/`, whose rows
 * say why they cannot raise. INVARIANT TOTAL.
 */
export interface Scalar {
  readonly type: ScalarType
  readonly node: ScalarNode
  readonly nullable: boolean
  /** For numbers: a proved range and grid of the value as printed; null where none is proved. */
  readonly range: Range | null
  /**
   * What the printed expression yields: the type itself, or a wider exact one in which it is computed so that nothing can overflow.
   * It is cast back where the type itself is needed.
   */
  readonly carrier: 'own' | 'int8' | 'numeric'
  /** Byte offset in the analyst's text. */
  readonly at: number
}

export interface Range {
  readonly low: Fraction
  readonly high: Fraction
  /** Every value is a multiple of it; null where no grid is proved. */
  readonly step: Fraction | null
}

export type ScalarNode =
  /** `clamped`: the clamp it is printed with; `offers`: the clamp the policy declares, taken on wherever a bound is needed. */
  | {
      readonly kind: 'column'
      readonly scan: number
      readonly column: string
      readonly clamped: Clamp | null
      readonly offers: Clamp | null
      readonly collation?: Collation
    }
  /** A text in the type's input form; null: NULL. */
  | { readonly kind: 'constant'; readonly text: string | null }
  /** A parameter of the block, 1-based; its value is bound as text. */
  | { readonly kind: 'parameter'; readonly number: number }
  /** A row of the table of functions over arguments; `words` are constants that are part of the row's form (a unit, a field). */
  | { readonly kind: 'apply'; readonly form: string; readonly args: readonly Scalar[]; readonly words: readonly string[] }

/** A text column's own collation, where it is not the database's. */
export interface Collation {
  readonly name: string
  readonly deterministic: boolean
}

export interface Clamp {
  /** Literals of the column's type. */
  readonly low: string
  readonly high: string
  /** Decimal text; for a float column, the grid its values are rounded to. */
  readonly step: string | null
}

/** Every scalar in `scalar`, itself first. */
export function* parts(scalar: Scalar): Generator<Scalar> {
  yield scalar
  if (scalar.node.kind === 'apply') for (const arg of scalar.node.args) yield* parts(arg)
}

/** The scans whose columns it reads. */
export function scansOf(scalar: Scalar): ReadonlySet<number> {
  const scans = new Set<number>()
  for (const part of parts(scalar)) if (part.node.kind === 'column') scans.add(part.node.scan)
  return scans
}

/** Whether it reads no column: then its value is the statement's own, and the lobby computes it before anything is debited. */
export function isFixed(scalar: Scalar): boolean {
  return scansOf(scalar).size === 0
}

/** Equality of what is computed; positions do not count. */
export function sameScalar(a: Scalar, b: Scalar): boolean {
  if (a.type.name !== b.type.name || a.type.schema !== b.type.schema) return false
  const [x, y] = [a.node, b.node]
  switch (x.kind) {
    case 'column':
      return y.kind === 'column' && x.scan === y.scan && x.column === y.column && JSON.stringify(x.clamped) === JSON.stringify(y.clamped)
    case 'constant':
      return y.kind === 'constant' && x.text === y.text
    case 'parameter':
      return y.kind === 'parameter' && x.number === y.number
    case 'apply':
      return (
        y.kind === 'apply' &&
        x.form === y.form &&
        x.args.length === y.args.length &&
        x.words.length === y.words.length &&
        x.words.every((word, i) => word === y.words[i]) &&
        x.args.every((arg, i) => {
          const other = y.args[i]
          return other !== undefined && sameScalar(arg, other)
        })
      )
  }
}
