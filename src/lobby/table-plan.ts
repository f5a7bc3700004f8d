import { createHash } from 'node:crypto'
import { check } from '../base/check.ts'
import type { DataSet, DataTable } from '../policy/data-set.ts'
import { literal, name, names, qualified } from './quote.ts'
import type { TableShape, VaultShape } from './vault-shape.ts'

/** One table of the lobby as it is to be: texts only. */
export interface TablePlan {
  readonly key: string
  readonly schema: string
  readonly name: string
  readonly kind: 'private' | 'published'
  readonly columns: readonly { readonly name: string; readonly type: string }[]
  /** Makes the table under another name, so that a copy can be filled before it takes the place of the old one. */
  createAs(schema: string, relation: string): string
  readonly indexes: readonly IndexPlan[]
  readonly foreignKeys: readonly { readonly name: string; readonly add: string }[]
  /** Changes when a shell has to be made anew. */
  readonly signature: string
}

export interface IndexPlan {
  /** As the vault calls it. */
  readonly name: string
  /** Makes it on the table of that name, under a name of its own. */
  createOn(schema: string, relation: string, index: string): string
}

/** What each table of the data set looks like in the lobby: the visible columns only, and the keys whose columns are all visible. */
export function planTables(dataSet: DataSet, shape: VaultShape): readonly TablePlan[] {
  return [...dataSet.tables].map(([key, table]) => planTable(dataSet, shape, key, table))
}

function planTable(dataSet: DataSet, shape: VaultShape, key: string, table: DataTable): TablePlan {
  const found = shape.tables.get(key)
  check(found, `the vault has ${key}, as the policy was fitted to it`)
  const columns = found.columns.filter((column) => table.columns.has(column.name))
  const definitions = columns.map((column) => `${name(column.name)} ${column.type}${table.columns.get(column.name)?.notNull === true ? ' NOT NULL' : ''}`)
  const indexes = planIndexes(found, table)
  const foreignKeys = planForeignKeys(dataSet, shape, found, table)
  const labels = shape.types.map((type) => (type.kind === 'enum' ? `${type.schema}.${type.name}` : JSON.stringify(type)))
  const text = JSON.stringify([table.kind, definitions, indexes.map((index) => index.createOn('', '', index.name)), foreignKeys, labels])
  return {
    key,
    schema: table.schema,
    name: table.name,
    kind: table.kind,
    columns,
    createAs: (schema, relation) => `CREATE TABLE ${qualified(schema, relation)} (${definitions.join(', ')})`,
    indexes,
    foreignKeys,
    signature: createHash('sha256').update(text).digest('hex'),
  }
}

/** A private shell keeps its keys, for the catalogue's readers; a published copy keeps the plain indexes as well, for its queries. */
function planIndexes(found: TableShape, table: DataTable): readonly IndexPlan[] {
  return found.indexes
    .filter((index) => index.columns.length > 0 && index.columns.every((column) => table.columns.has(column)))
    .filter((index) => table.kind === 'published' || index.kind !== 'plain')
    .map((index) => ({
      name: index.name,
      createOn: (schema, relation, own) =>
        index.kind === 'plain'
          ? `CREATE INDEX ${name(own)} ON ${qualified(schema, relation)} (${names(index.columns)})`
          : `ALTER TABLE ${qualified(schema, relation)} ADD CONSTRAINT ${name(own)} ${index.kind === 'primary' ? 'PRIMARY KEY' : 'UNIQUE'} (${names(index.columns)})`,
    }))
}

function planForeignKeys(dataSet: DataSet, shape: VaultShape, found: TableShape, table: DataTable): TablePlan['foreignKeys'] {
  return found.foreignKeys.flatMap((key) => {
    const target = dataSet.tables.get(key.table)
    if (target === undefined || !key.columns.every((column) => table.columns.has(column)) || !key.referenced.every((column) => target.columns.has(column)))
      return []
    const unique = shape.tables.get(key.table)?.indexes.some((index) => index.kind !== 'plain' && sameColumns(index.columns, key.referenced)) ?? false
    if (!unique) return []
    const add = `ALTER TABLE ${qualified(table.schema, table.name)} ADD CONSTRAINT ${name(key.name)}
      FOREIGN KEY (${names(key.columns)}) REFERENCES ${qualified(target.schema, target.name)} (${names(key.referenced)})`
    return [{ name: key.name, add }]
  })
}

function sameColumns(left: readonly string[], right: readonly string[]): boolean {
  return left.length === right.length && left.every((column) => right.includes(column))
}

/** COMMENT statements that state the policy's facts of a table and its columns. */
export function commentTexts(dataSet: DataSet, table: DataTable): readonly string[] {
  const on = qualified(table.schema, table.name)
  const columns = [...table.columns.values()].map((column) => {
    const facts = table.kind === 'published' ? [] : columnFacts(column)
    return `COMMENT ON COLUMN ${on}.${name(column.name)} IS ${facts.length === 0 ? 'NULL' : literal(facts.join('; '))}`
  })
  return [`COMMENT ON TABLE ${on} IS ${literal(tableFact(dataSet, table))}`, ...columns]
}

function tableFact(dataSet: DataSet, table: DataTable): string {
  if (table.kind === 'published') return 'published: a copy of the whole table, free to read'
  const { groups, rows } = table.bounds
  const owner = table.owner.kind === 'column' ? table.owner.column : table.owner.steps.map((step) => `${step.column} -> ${step.table}`).join(', ')
  return (
    `private, a ${dataSet.personCalled}'s rows by ${owner}: only aggregates are answered; ` +
    `a ${dataSet.personCalled} counts in at most ${groups} ${groups === 1 ? 'group' : 'groups'}, with at most ${rows} ${rows === 1 ? 'row' : 'rows'} in each`
  )
}

function columnFacts(column: NonNullable<ReturnType<DataTable['columns']['get']>>): readonly string[] {
  return [
    ...(column.role === 'linking' ? ['linking: usable in joins and distinct counts, not in output'] : []),
    ...(column.clamp === null ? [] : [`clamp ${column.clamp[0]} to ${column.clamp[1]}`]),
    ...(column.step === null ? [] : [`step ${column.step}`]),
    ...(column.values === null ? [] : [`values ${column.values.join(', ')}`]),
    ...(column.valuesFrom === null ? [] : [`values from ${column.valuesFrom.table}.${column.valuesFrom.column}`]),
  ]
}
