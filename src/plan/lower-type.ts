import { refuse } from '../base/refusal.ts'
import { scalarType, scalarTypeOf, type ScalarType } from '../catalog/scalar-type.ts'
import type { DataSet } from '../policy/data-set.ts'
import type { TypeRef } from '../sql/tree.ts'

const spellings: Readonly<Record<string, string>> = {
  bool: 'bool',
  int2: 'int2',
  int4: 'int4',
  int8: 'int8',
  numeric: 'numeric',
  float4: 'float4',
  float8: 'float8',
  text: 'text',
  varchar: 'varchar',
  bpchar: 'bpchar',
  date: 'date',
  timestamp: 'timestamp',
  timestamptz: 'timestamptz',
  time: 'time',
  interval: 'interval',
  uuid: 'uuid',
}

/** A type named in an expression over private rows. Modifiers would round or cut: refused. */
export function lowerType(type: TypeRef, dataSet: DataSet, at: number): ScalarType {
  const name = type.name.at(-1) ?? ''
  const schema = type.name.length > 1 ? type.name.at(-2) : undefined
  if (type.array.length > 0 || type.setof) refuse('expr.unsupported', { what: `a cast to an array of ${name}` }, at)
  if (type.modifiers.length > 0) refuse('expr.unsupported', { what: `a cast to ${name} with a modifier` }, at)
  if (schema === undefined || schema === 'pg_catalog') {
    const known = spellings[name]
    if (known !== undefined) return scalarType(known)
  }
  for (const table of dataSet.tables.values())
    for (const column of table.columns.values())
      if (column.type.kind === 'enum' && column.type.name === name && (schema === undefined || schema === column.type.schema)) {
        const found = scalarTypeOf(column.type)
        if (found !== null) return found
      }
  return refuse('expr.unsupported', { what: `a cast to ${name}` }, at)
}
