import { Fraction } from '../base/fraction.ts'
import type { Clamp, Range, Scalar } from '../catalog/scalar.ts'
import { opaqueType, scalarTypeOf, type ScalarType } from '../catalog/scalar-type.ts'
import type { DataColumn } from '../policy/data-set.ts'

const integers: Readonly<Record<string, bigint>> = { int2: 2n ** 15n, int4: 2n ** 31n, int8: 2n ** 63n }

/** What the type alone proves of a number. */
function rangeOfType(type: ScalarType, column: DataColumn): Range | null {
  const size = integers[type.name]
  if (size !== undefined) return { low: Fraction.make(-size), high: Fraction.make(size - 1n), step: Fraction.one }
  const scale = /^numeric\((\d+),(\d+)\)$/.exec(column.type.printed)
  if (scale === null) return null
  const [, precision = '0', places = '0'] = scale
  const step = Fraction.make(1n, 10n ** BigInt(places))
  const most = Fraction.make(10n ** BigInt(precision)).mul(step)
  return { low: most.neg(), high: most, step }
}

/** A column of a scan as an expression sees it. */
export function lowerColumn(scan: number, column: DataColumn, at: number): Scalar {
  const type = scalarTypeOf(column.type) ?? opaqueType(column.type)
  const offers: Clamp | null = column.clamp === null ? null : { low: column.clamp[0], high: column.clamp[1], step: column.step }
  // a numeric column may hold NaN, which no range covers: its range counts only once it is clamped
  const range = rangeOfType(type, column)
  return {
    type,
    node: {
      kind: 'column',
      scan,
      column: column.name,
      clamped: null,
      offers,
      ...(column.collation == null ? {} : { collation: { name: column.collation, deterministic: column.deterministic } }),
    },
    nullable: !column.notNull,
    range: type.family === 'numeric' ? null : range,
    carrier: 'own',
    at,
  }
}

/** The grid a numeric column's own type proves, or null. */
export function provedStep(column: DataColumn): Fraction | null {
  const type = scalarTypeOf(column.type)
  return type === null ? null : (rangeOfType(type, column)?.step ?? null)
}
