import type { DataSet } from '../policy/data-set.ts'
import { queryReads } from './query-reads.ts'
import type { Expr, FromItem, Query, Select } from '../sql/tree.ts'
import { containsAggregate } from './contains.ts'
import type { RowsTable } from './context.ts'
import { findTable } from './names.ts'

export interface Names {
  readonly dataSet: DataSet
  /** Common tables in sight that are rows (private or published), by name. */
  readonly rows: ReadonlyMap<string, RowsTable>
  /** Common tables in sight that are finished results: they hide tables of the same name. */
  readonly finished: ReadonlySet<string>
}

/** Whether a SELECT aggregates: by an aggregate call of its own, GROUP BY or HAVING. */
export function aggregates(select: Select, order: readonly Expr[]): boolean {
  return select.group.length > 0 || select.having !== null || select.targets.some((target) => containsAggregate(target.value)) || order.some(containsAggregate)
}

/** Whether a query yields rows of persons as they are: it would have to stand inside an aggregate. */
export function yieldsRows(query: Query, names: Names): boolean {
  const inner = withNames(query, names)
  const body = query.body
  if (body.kind === 'values') return false
  if (body.kind === 'set-operation') return yieldsRows(body.left, inner) || yieldsRows(body.right, inner)
  if (
    aggregates(
      body,
      query.order.map((item) => item.by),
    ) ||
    body.distinct !== null
  )
    return false
  return body.from.some((item) => readsRows(item, inner))
}

/** Whether an item of FROM reads rows of persons. */
export function readsRows(item: FromItem, names: Names): boolean {
  switch (item.kind) {
    case 'table': {
      const bare = item.name.at(-1) ?? ''
      if (item.name.length === 1) {
        const rows = names.rows.get(bare)
        if (rows !== undefined) return yieldsRows(rows.query, { ...names, rows: rows.sees })
        if (names.finished.has(bare)) return false
      }
      return findTable(names.dataSet, item.name)?.kind === 'private'
    }
    case 'subquery':
      return yieldsRows(item.query, names)
    case 'join':
      return readsRows(item.left, names) || readsRows(item.right, names)
    case 'function':
      return false
  }
}

function without(rows: ReadonlyMap<string, RowsTable>, name: string): ReadonlyMap<string, RowsTable> {
  return new Map([...rows].filter(([each]) => each !== name))
}

/** The names in sight inside a query with common tables of its own. */
export function withNames(query: Query, names: Names): Names {
  let inner = names
  for (const table of query.with?.tables ?? []) {
    const rows = yieldsRows(table.query, inner) || isPlainRows(table.query, inner)
    inner = rows
      ? {
          ...inner,
          rows: new Map([...inner.rows, [table.name, { name: table.name, columns: table.columns, query: table.query, sees: inner.rows }]]),
          finished: new Set([...inner.finished].filter((name) => name !== table.name)),
        }
      : { ...inner, rows: without(inner.rows, table.name), finished: new Set([...inner.finished, table.name]) }
  }
  return inner
}

/** Rows of published tables, filtered and projected only: a block may use them as they are. */
function isPlainRows(query: Query, names: Names): boolean {
  const body = query.body
  if (query.limit !== null || query.offset !== null || query.with !== null) return false
  if (body.kind === 'values') return true
  if (body.kind === 'set-operation' || body.distinct !== null || body.windows.length > 0) return false
  if (
    aggregates(
      body,
      query.order.map((item) => item.by),
    )
  )
    return false
  return queryReads(query).every((name) => (name.length === 1 && names.rows.has(name[0] ?? '')) || findTable(names.dataSet, name) !== null)
}
