import { eachQuery } from '../sql/walk-query.ts'
import type { FromItem, Name, Query } from '../sql/tree.ts'

/** Every table name in a query's FROM items, at any depth, subqueries included. */
export function queryReads(query: Query): readonly Name[] {
  const found: Name[] = []
  const visit = (item: FromItem): void => {
    if (item.kind === 'table') found.push(item.name)
    if (item.kind === 'join') {
      visit(item.left)
      visit(item.right)
    }
  }
  eachQuery(query, (inner) => {
    if (inner.body.kind === 'select') for (const item of inner.body.from) visit(item)
  })
  return found
}
