import type { Expr, Query, Statement } from './tree.ts'

/** Whether two expressions are the same tree; where they were written does not matter. */
export function sameExpr(a: Expr, b: Expr): boolean {
  return sameValue(a, b)
}

/** Whether two statements, queries or expressions are the same tree; where they were written does not matter. */
export function sameTree(a: Statement | Query | Expr, b: Statement | Query | Expr): boolean {
  return sameValue(a, b)
}

/** Trees are plain data: records, lists, texts, numbers, truth values and null. */
function sameValue(a: unknown, b: unknown): boolean {
  if (a === b) return true
  if (typeof a !== 'object' || typeof b !== 'object' || a === null || b === null) return false
  if (Array.isArray(a) || Array.isArray(b)) {
    return Array.isArray(a) && Array.isArray(b) && a.length === b.length && a.every((item, index) => sameValue(item, b[index]))
  }
  const [left, right] = [a as Readonly<Record<string, unknown>>, b as Readonly<Record<string, unknown>>]
  const names = Object.keys(left).filter((name) => name !== 'at')
  const count = Object.keys(right).filter((name) => name !== 'at').length
  return names.length === count && names.every((name) => Object.hasOwn(right, name) && sameValue(left[name], right[name]))
}
