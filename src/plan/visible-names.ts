import { labelOf } from '../sql/label.ts'
import type { Alias, FromItem, Query } from '../sql/tree.ts'
import type { RowsTable } from './context.ts'
import { findTable } from './names.ts'
import type { DataSet, DataTable } from '../policy/data-set.ts'

/** What an item of FROM makes visible, by name only: enough to say which column a name means. */
export interface NamedItem {
  readonly name: string
  readonly columns: readonly string[]
  /** The table read, where the item is one. */
  readonly table: DataTable | null
}

/** The items of a FROM list, joins taken apart. */
export function namedItems(items: readonly FromItem[], dataSet: DataSet, common: ReadonlyMap<string, RowsTable>): readonly NamedItem[] {
  return items.flatMap((item) => namedItem(item, dataSet, common))
}

function namedItem(item: FromItem, dataSet: DataSet, common: ReadonlyMap<string, RowsTable>): readonly NamedItem[] {
  switch (item.kind) {
    case 'join': {
      const sides = [...namedItem(item.left, dataSet, common), ...namedItem(item.right, dataSet, common)]
      return item.alias === null ? sides : [{ name: item.alias.name, columns: sides.flatMap((side) => side.columns), table: null }]
    }
    case 'table': {
      const bare = item.name.at(-1) ?? ''
      const rows = item.name.length === 1 ? common.get(bare) : undefined
      if (rows !== undefined) return [aliased(item.alias, bare, rows.columns.length > 0 ? rows.columns : columnsOf(rows.query, dataSet, rows.sees), null)]
      const table = findTable(dataSet, item.name)
      return [aliased(item.alias, bare, table === null ? [] : [...table.columns.keys()], table)]
    }
    case 'subquery':
      return [aliased(item.alias, '', columnsOf(item.query, dataSet, common), null)]
    case 'function': {
      const call = item.functions[0]?.call
      const name = item.alias?.name ?? (call?.kind === 'call' ? (call.name.at(-1) ?? '') : '')
      return [aliased(item.alias, name, [name], null)]
    }
  }
}

function aliased(alias: Alias | null, name: string, columns: readonly string[], table: DataTable | null): NamedItem {
  return { name: alias?.name ?? name, columns: columns.map((column, i) => alias?.columns[i] ?? column), table }
}

/** The column names a query gives. */
export function columnsOf(query: Query, dataSet: DataSet, common: ReadonlyMap<string, RowsTable>): readonly string[] {
  const body = query.body
  if (body.kind === 'set-operation') return columnsOf(body.left, dataSet, common)
  if (body.kind === 'values') return (body.rows[0] ?? []).map((_, i) => `column${String(i + 1)}`)
  const items = namedItems(body.from, dataSet, common)
  return body.targets.flatMap((target) => {
    const value = target.value
    if (value.kind !== 'column' || !value.star) return [labelOf(target)]
    const wanted = value.name.at(-1)
    return items.filter((item) => wanted === undefined || item.name === wanted).flatMap((item) => item.columns)
  })
}
