import type { Scalar } from '../catalog/scalar.ts'
import { sameType, type ScalarType } from '../catalog/scalar-type.ts'
import type { DataColumn, PrivateTable, PublishedTable } from '../policy/data-set.ts'

/** Rows the statement itself lists: VALUES or generate_series over fixed values. Published by nature. */
export interface ListedRows {
  readonly kind: 'listed'
  readonly name: string
  readonly source: { readonly kind: 'values'; readonly rows: readonly (readonly Scalar[])[] } | { readonly kind: 'series'; readonly args: readonly Scalar[] }
  readonly columns: ReadonlyMap<string, DataColumn>
}

/** One reading of one table in the FROM of a block; it is printed as `s<index>`. */
export interface Scan {
  readonly index: number
  readonly table: PrivateTable | PublishedTable | ListedRows
  readonly at: number
}

/** The FROM and WHERE of a block. RIGHT joins are turned into LEFT; comma lists and CROSS JOIN are inner joins without a condition. */
export type Source =
  | { readonly kind: 'scan'; readonly scan: Scan }
  | {
      readonly kind: 'join'
      readonly type: 'inner' | 'left'
      readonly left: Source
      readonly right: Source
      readonly on: readonly Scalar[]
      readonly at: number
    }
  | { readonly kind: 'filter'; readonly input: Source; readonly tests: readonly Scalar[] }

export function* scansIn(source: Source): Generator<Scan> {
  switch (source.kind) {
    case 'scan':
      yield source.scan
      return
    case 'filter':
      yield* scansIn(source.input)
      return
    case 'join':
      yield* scansIn(source.left)
      yield* scansIn(source.right)
  }
}

export function indexesIn(source: Source): ReadonlySet<number> {
  return new Set([...scansIn(source)].map((scan) => scan.index))
}

/** Scans on the padded side of a LEFT JOIN: NULL on the rows that found no partner. */
export function paddedScans(source: Source): ReadonlySet<number> {
  switch (source.kind) {
    case 'scan':
      return new Set()
    case 'filter':
      return paddedScans(source.input)
    case 'join':
      return new Set([...paddedScans(source.left), ...(source.type === 'left' ? indexesIn(source.right) : paddedScans(source.right))])
  }
}

/** Whether any private table is read in it. */
export function isPrivate(source: Source): boolean {
  for (const scan of scansIn(source)) if (scan.table.kind === 'private') return true
  return false
}

/** The conjuncts of a condition. */
export function conjuncts(test: Scalar): readonly Scalar[] {
  return test.node.kind === 'apply' && test.node.form === 'and' ? test.node.args.flatMap(conjuncts) : [test]
}

const wholes: ReadonlySet<string> = new Set(['int2', 'int4', 'int8', 'numeric'])
const texts: ReadonlySet<string> = new Set(['text', 'varchar'])

/**
 * Whether = between the two types is the equality of either of them. Between others it is none: two bigints equal one float8, two local times one instant, and a
 * chain of such "equal" columns would make two persons one.
 */
function equalAlike(a: ScalarType, b: ScalarType): boolean {
  return sameType(a, b) || (wholes.has(a.name) && wholes.has(b.name)) || (texts.has(a.name) && texts.has(b.name))
}

/** A pair of columns that a conjunct equates, or null. */
export function equated(test: Scalar): readonly [ColumnRef, ColumnRef] | null {
  if (test.node.kind !== 'apply' || test.node.form !== '=') return null
  const [a, b] = test.node.args
  if (a?.node.kind !== 'column' || b?.node.kind !== 'column' || a.node.clamped !== null || b.node.clamped !== null) return null
  if (!equalAlike(a.type, b.type) || a.node.collation?.deterministic === false || b.node.collation?.deterministic === false) return null
  return [
    { scan: a.node.scan, column: a.node.column },
    { scan: b.node.scan, column: b.node.column },
  ]
}

export interface ColumnRef {
  readonly scan: number
  readonly column: string
}

export function refKey(ref: ColumnRef): string {
  return `${String(ref.scan)}.${ref.column}`
}
