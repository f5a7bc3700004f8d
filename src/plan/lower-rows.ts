import { refuse } from '../base/refusal.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { labelOf } from '../sql/label.ts'
import type { Query, Select, Target } from '../sql/tree.ts'
import { containsAggregate } from './contains.ts'
import type { Context, RowsTable } from './context.ts'
import { lowerCondition, lowerExpr } from './lower-expr.ts'
import { lowerFromList } from './lower-from.ts'
import { lowerValues } from './lower-listed.ts'
import { conjuncts, type Source } from './relation.ts'
import type { Scope, VisibleColumn } from './scope.ts'

export interface Rows {
  readonly source: Source
  readonly columns: readonly VisibleColumn[]
}

/**
 * A derived table or common table that only filters and projects rows: it is read as if its text stood in the FROM that uses it.
 * Everything else that a derived table may do to rows is refused with its name.
 */
export function lowerRows(query: Query, context: Context, at: number): Rows {
  if (query.limit !== null || query.offset !== null) refuse('block.shape', { what: 'LIMIT over rows' }, at)
  const inner = query.with === null ? context : withTables(query, context, at)
  const body = query.body
  if (body.kind === 'values') return lowerValues(body, inner, at)
  if (body.kind === 'set-operation') return refuse('block.shape', { what: `${body.word.toUpperCase()} over rows` }, at)
  if (body.group.length > 0 || body.having !== null || body.targets.some((target) => containsAggregate(target.value)))
    refuse('block.mixed', { what: 'the result of another aggregate query' }, at)
  if (body.distinct !== null) refuse('block.shape', { what: 'DISTINCT over rows' }, at)
  if (body.windows.length > 0) refuse('rows.window', { table: 'the derived table' }, at)
  return lowerSelect(body, inner)
}

/** The context inside a query with common tables of its own. */
export function withTables(query: Query, context: Context, at: number): Context {
  if (query.with === null) return context
  if (query.with.recursive) refuse('block.shape', { what: 'WITH RECURSIVE' }, at)
  const tables = new Map<string, RowsTable>(context.commonTables)
  for (const table of query.with.tables) tables.set(table.name, { name: table.name, columns: table.columns, query: table.query, sees: new Map(tables) })
  return { ...context, commonTables: tables }
}

function lowerSelect(select: Select, context: Context): Rows {
  const from = lowerFromList(select.from, context)
  const columns = select.targets.flatMap((target) => lowerTarget(target, from.scope, context))
  if (select.where === null) return { source: from.source, columns }
  return { source: { kind: 'filter', input: from.source, tests: conjuncts(lowerCondition(select.where, from.scope, context)) }, columns }
}

function lowerTarget(target: Target, scope: Scope, context: Context): readonly VisibleColumn[] {
  const value = target.value
  if (value.kind === 'column' && value.star) {
    if (value.name.length === 0) return scope.star
    const item = scope.items.find((each) => each.name === value.name.at(-1))
    return item?.columns ?? refuse('block.correlated', { column: `${value.name.join('.')}.*` }, value.at)
  }
  const scalar: Scalar = lowerExpr(value, scope, context)
  return [{ name: labelOf(target), scalar }]
}
