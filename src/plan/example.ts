import type { DataSet, PrivateTable } from '../policy/data-set.ts'
import { quoteName } from '../sql/print.ts'
import type { FromItem, Query } from '../sql/tree.ts'
import { findTable, typedName } from './names.ts'

/** A statement that works on the private table the query reads first: hints are made of the analyst's own tables. */
export function exampleFor(dataSet: DataSet, query: Query | null): string {
  const table = (query === null ? null : firstPrivate(dataSet, query)) ?? anyPrivate(dataSet)
  return table === null ? 'SELECT count(*) FROM …' : exampleOf(dataSet, table)
}

/** A statement that works on that table: a count, by a declared key where there is one. */
export function exampleOf(dataSet: DataSet, table: PrivateTable): string {
  const name = typedName(dataSet, table).split('.').map(quoteName).join('.')
  const key = [...table.columns.values()].find(
    (column) => column.role === 'listed' && (column.values !== null || column.valuesFrom !== null || column.type.name === 'bool'),
  )
  if (key === undefined) return `SELECT count(*) FROM ${name}`
  return `SELECT ${quoteName(key.name)}, count(*) FROM ${name} GROUP BY ${quoteName(key.name)}`
}

function anyPrivate(dataSet: DataSet): PrivateTable | null {
  for (const table of dataSet.tables.values()) if (table.kind === 'private') return table
  return null
}

/** The first private table that occurs in the query's FROM, at any depth. */
export function firstPrivate(dataSet: DataSet, query: Query): PrivateTable | null {
  const inItem = (item: FromItem): PrivateTable | null => {
    switch (item.kind) {
      case 'table': {
        const table = findTable(dataSet, item.name)
        return table?.kind === 'private' ? table : null
      }
      case 'subquery':
        return firstPrivate(dataSet, item.query)
      case 'join':
        return inItem(item.left) ?? inItem(item.right)
      case 'function':
        return null
    }
  }
  for (const table of query.with?.tables ?? []) {
    const found = firstPrivate(dataSet, table.query)
    if (found !== null) return found
  }
  const body = query.body
  if (body.kind === 'set-operation') return firstPrivate(dataSet, body.left) ?? firstPrivate(dataSet, body.right)
  if (body.kind === 'values') return null
  for (const item of body.from) {
    const found = inItem(item)
    if (found !== null) return found
  }
  return null
}
