import { refuse } from '../base/refusal.ts'
import type { CatalogType } from '../catalog/catalog.ts'
import { namedType, scalarTypeOf, type ScalarType } from '../catalog/scalar-type.ts'
import type { DataSet } from '../policy/data-set.ts'
import type { TypeRef } from '../sql/tree.ts'

/** The enum among the data set's column types that passes the test, or null. */
export function enumType(dataSet: DataSet, test: (type: CatalogType) => boolean): ScalarType | null {
  for (const table of dataSet.tables.values())
    for (const column of table.columns.values()) if (column.type.kind === 'enum' && test(column.type)) return scalarTypeOf(column.type)
  return null
}

/** A type named in an expression over private rows. Modifiers would round or cut: refused. */
export function lowerType(type: TypeRef, dataSet: DataSet, at: number): ScalarType {
  const name = type.name.at(-1) ?? ''
  const schema = type.name.length > 1 ? type.name.at(-2) : undefined
  if (type.array.length > 0 || type.setof) refuse('expr.unsupported', { what: `a cast to an array of ${name}` }, at)
  if (type.modifiers.length > 0) refuse('expr.unsupported', { what: `a cast to ${name} with a modifier` }, at)
  const builtIn = schema === undefined || schema === 'pg_catalog' ? namedType(name) : null
  const known = builtIn ?? enumType(dataSet, (each) => each.name === name && (schema === undefined || schema === each.schema))
  return known ?? refuse('expr.unsupported', { what: `a cast to ${name}` }, at)
}
