import { refuse } from '../base/refusal.ts'
import type { Scalar } from '../catalog/scalar.ts'

/** A column as FROM makes it visible. */
export interface VisibleColumn {
  readonly name: string
  readonly scalar: Scalar
}

/** What one item of FROM makes visible under a name. */
export interface Visible {
  /** The alias or table name; '' for a join without an alias, whose merged columns only bare names reach. */
  readonly name: string
  /** The schema it may be qualified with; '' where it has an alias. */
  readonly schema: string
  readonly columns: readonly VisibleColumn[]
}

export interface Scope {
  readonly items: readonly Visible[]
  /** Columns in the order of `*`, USING columns merged. */
  readonly star: readonly VisibleColumn[]
}

/** The column a name means in FROM, or null where it means none. An ambiguous one is PostgreSQL's to complain about. */
export function findColumn(scope: Scope, name: readonly string[]): Scalar | null {
  const column = name.at(-1)
  if (column === undefined) return null
  if (name.length === 1) {
    const found = scope.star.filter((each) => each.name === column)
    return found[0]?.scalar ?? null
  }
  const table = name.at(-2)
  const schema = name.at(-3)
  for (const item of scope.items) {
    if (item.name !== table || (schema !== undefined && item.schema !== schema)) continue
    return item.columns.find((each) => each.name === column)?.scalar ?? null
  }
  return null
}

/** Two scopes side by side. */
export function besides(a: Scope, b: Scope): Scope {
  return { items: [...a.items, ...b.items], star: [...a.star, ...b.star] }
}

/** The scope behind an outer join: every column may be NULL. What is no plain column would have to be computed before the join. */
export function padded(scope: Scope, at: number): Scope {
  const pad = (column: VisibleColumn): VisibleColumn => {
    if (column.scalar.node.kind !== 'column') refuse('block.shape', { what: 'a computed column on the padded side of an outer join' }, at)
    return { name: column.name, scalar: { ...column.scalar, nullable: true } }
  }
  return { items: scope.items.map((item) => ({ ...item, columns: item.columns.map(pad) })), star: scope.star.map(pad) }
}
