import type { ScalarType } from '../catalog/scalar-type.ts'
import type { DataSet } from '../policy/data-set.ts'
import type { Query } from '../sql/tree.ts'
import type { Scan } from './relation.ts'

/** A parameter of a block: its type, and its value once the statement runs (undefined before). */
export interface Parameter {
  readonly type: ScalarType
  readonly value: string | null | undefined
}

/** A common table as a block may use it: rows, not yet aggregated. */
export interface RowsTable {
  readonly name: string
  readonly columns: readonly string[]
  readonly query: Query
  /** The common tables that its own query can name: those before it, never itself. */
  readonly sees: ReadonlyMap<string, RowsTable>
}

/** What lowering a block works from. */
export interface Context {
  readonly dataSet: DataSet
  readonly parameters: readonly Parameter[]
  /** The session's transaction_timestamp(), ISO 8601 with offset; a fixed instant before the statement runs. */
  readonly now: string
  readonly timeZone: string
  readonly commonTables: ReadonlyMap<string, RowsTable>
  /** Scans made so far, in order: the one thing that grows while a block is lowered. */
  readonly scans: Scan[]
}
