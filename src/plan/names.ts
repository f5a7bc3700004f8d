import type { DataSet, DataTable } from '../policy/data-set.ts'
import type { Name } from '../sql/tree.ts'

/** The data set's table that a name means, or null. Bare names are looked up in the data set's schema. */
export function findTable(dataSet: DataSet, name: Name): DataTable | null {
  const table = name.at(-1) ?? ''
  const schema = name.length > 1 ? (name.at(-2) ?? '') : dataSet.schema
  return dataSet.tables.get(`${schema}.${table}`) ?? null
}

/** A table's name as an analyst types it. */
export function typedName(dataSet: DataSet, table: { readonly schema: string; readonly name: string }): string {
  return table.schema === dataSet.schema ? table.name : `${table.schema}.${table.name}`
}
