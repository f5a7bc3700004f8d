import { children } from '../sql/walk.ts'
import type { Expr } from '../sql/tree.ts'
import { asAggregate } from './aggregates.ts'

/** Whether an aggregate of this SELECT occurs in the expression; subqueries have their own. */
export function containsAggregate(expr: Expr): boolean {
  return asAggregate(expr) !== null || children(expr).some(containsAggregate)
}

/** Whether a window call occurs in the expression. */
export function containsWindow(expr: Expr): boolean {
  return (expr.kind === 'call' && expr.over !== null) || children(expr).some(containsWindow)
}
