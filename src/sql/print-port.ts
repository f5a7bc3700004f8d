import type { Expr, Query } from './tree.ts'

/**
 * How tightly a printed expression holds together, in gram.y's order. An operand is put in parentheses unless it holds at least as tightly as its
 * place demands.
 */
export const levels = {
  any: 0,
  or: 1,
  and: 2,
  not: 3,
  is: 4,
  compare: 5,
  like: 6,
  op: 7,
  add: 8,
  multiply: 9,
  power: 10,
  at: 11,
  collate: 12,
  sign: 13,
  cast: 15,
  primary: 16,
} as const

/** How one family of printers prints what belongs to another. */
export interface Printer {
  /** Prints an expression for a place that demands `level` or more. */
  expr(e: Expr, level?: number): string
  /** Prints a query without parentheses around it. */
  query(q: Query): string
}
