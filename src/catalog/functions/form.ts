import type { Expr } from '../../sql/tree.ts'

/** A row of the table of functions that may run on private rows. The README's table is made of these. */
export interface Form {
  /** As an analyst knows it. */
  readonly sql: string
  /** Why the printed form cannot raise, with any SQLSTATE, whatever the row holds. INVARIANT TOTAL. */
  readonly total: string
  /** NULL whenever any argument is NULL. */
  readonly strict: boolean
  print(args: readonly Expr[], words: readonly string[]): Expr
}

/** The argument at `i`; a wrong count is our own bug, as the resolvers made the node. */
export function argument(args: readonly Expr[], i: number): Expr {
  const arg = args[i]
  if (arg === undefined) throw new RangeError(`a form lacks its argument ${String(i)}`)
  return arg
}

/** The word at `i`; a wrong count is our own bug. */
export function wordAt(words: readonly string[], i: number): string {
  const word = words[i]
  if (word === undefined) throw new RangeError(`a form lacks its word ${String(i)}`)
  return word
}
