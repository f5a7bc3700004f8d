import type { RawNode } from './raw.ts'
import type { Expr, Query } from './tree.ts'

/** How one family of node readers reads what belongs to another. */
export interface Reader {
  expr(node: RawNode): Expr
  /** Reads a SelectStmt. */
  query(node: RawNode): Query
}
