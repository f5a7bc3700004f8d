import type { CatalogColumn, CatalogTable, CatalogType } from '../catalog/catalog.ts'
import type { Findings } from './complaint.ts'
import type { Owner } from './data-set.ts'
import { isProvedUnique } from './fit-tables.ts'
import type { Schemed } from './fit-tables.ts'
import { didYouMean } from './near.ts'
import { columnReference } from './names.ts'
import type { DraftDataSet } from './read.ts'
import { canIdentify, sameKeyType } from './type.ts'

/** The person key as the catalogue knows it. */
export interface PersonKey {
  readonly table: string
  readonly column: CatalogColumn
}

/** The person key: it exists, is unique (by INVARIANT UNIQUE) and not NULL, and equal keys print alike. Null where it is not so. */
export function fitPersonKey(draft: DraftDataSet, tables: Schemed, findings: Findings): PersonKey | null {
  const written = draft.content.person.key
  const place = draft.place(['person', 'key'])
  const reference = columnReference(written, tables.schema)
  const table = tables.catalog.get(reference.table)
  if (table === undefined) {
    findings.complain(
      place,
      `person.key: the vault has no table ${reference.table}`,
      didYouMean(reference.table, [...tables.catalog.keys()], 'name the table with one row for each person'),
    )
    return null
  }
  const column = columnOf(table, reference.column)
  if (column === undefined) {
    findings.complain(place, `person.key: ${reference.table} has no column ${reference.column}`, nearColumn(table, reference.column))
    return null
  }
  if (!column.notNull) findings.complain(place, `person.key: ${written} can be NULL`, 'declare it NOT NULL (validated), or name another column')
  if (!isProvedUnique(table, reference.column))
    findings.complain(
      place,
      `person.key: ${written} is not proved unique`,
      'it needs a primary key, or a unique index that is valid, not partial, not deferrable and on this column alone, on an ordinary or partitioned table without inheritance children',
    )
  if (!canIdentify(column.type) || !column.deterministic)
    findings.complain(
      place,
      `person.key: ${written} has type ${column.type.printed}, in which equal values may print apart`,
      'use an integer, uuid, text or varchar column with a deterministic collation, or numeric with a scale',
    )
  if (tables.published.has(reference.table))
    findings.complain(
      draft.keyPlace(['tables', listedName(draft, tables, reference.table)]),
      `${reference.table} holds the person key and cannot be published`,
      `write person: ${reference.column} with bounds and columns`,
    )
  const listed = tables.owned.get(reference.table)
  if (listed !== undefined && listed.declared.person !== reference.column)
    findings.complain(
      draft.place(['tables', listed.listedAs, 'person']),
      `${reference.table} holds the person key: its rows belong to ${reference.column}`,
      `write person: ${reference.column}`,
    )
  return { table: reference.table, column }
}

/**
 * How each private table's rows find their person: INVARIANT OWNED begins here, since every step leads to at most one row.
 * A table whose way could not be made out is missing from the result, and complained of.
 */
export function fitOwners(draft: DraftDataSet, tables: Schemed, person: CatalogType | null, findings: Findings): ReadonlyMap<string, Owner> {
  const owners = new Map<string, Owner | null>()

  const visit = (key: string, underway: readonly string[]): Owner | null => {
    const known = owners.get(key)
    if (known !== undefined) return known
    const listed = tables.owned.get(key)
    if (listed === undefined) return null
    const { declared, table, listedAs } = listed
    const path = ['tables', listedAs, 'person']
    let owner: Owner | null
    if (typeof declared.person === 'string') {
      owner = ownColumn(declared.person, table, key, path)
    } else {
      owner = through(declared.person, table, key, path, underway)
    }
    owners.set(key, owner)
    return owner
  }

  const ownColumn = (name: string, table: CatalogTable, key: string, path: readonly string[]): Owner | null => {
    const column = columnOf(table, name)
    const place = draft.place(path)
    if (column === undefined) {
      findings.complain(place, `${key} has no column ${name}`, nearColumn(table, name))
      return null
    }
    if (person !== null && !sameKeyType(column.type, person)) {
      findings.complain(
        place,
        `${key}.${name} has type ${column.type.printed}, but the person key has type ${person.printed}`,
        'name the column that holds the person key, or give both the same type',
      )
      return null
    }
    return { kind: 'column', column: name }
  }

  const through = (
    way: { readonly through: string; readonly by: string },
    table: CatalogTable,
    key: string,
    path: readonly string[],
    underway: readonly string[],
  ): Owner | null => {
    const reference = columnReference(way.through, tables.schema)
    const throughPlace = draft.place([...path, 'through'])
    const by = columnOf(table, way.by)
    if (by === undefined) findings.complain(draft.place([...path, 'by']), `${key} has no column ${way.by}`, nearColumn(table, way.by))
    if (reference.table === key || underway.includes(reference.table)) {
      findings.complain(throughPlace, `the way from ${key} to its person leads back to ${reference.table}`, 'end every way at a table with a person column')
      return null
    }
    const next = tables.owned.get(reference.table)
    if (next === undefined) {
      findings.complain(
        throughPlace,
        `${reference.table} is no private table of this policy`,
        didYouMean(reference.table, [...tables.owned.keys()], 'list it with its person'),
      )
      return null
    }
    const target = columnOf(next.table, reference.column)
    if (target === undefined) {
      findings.complain(throughPlace, `${reference.table} has no column ${reference.column}`, nearColumn(next.table, reference.column))
      return null
    }
    if (!isProvedUnique(next.table, reference.column))
      findings.complain(
        throughPlace,
        `${way.through} is not proved unique, so a row of ${key} could belong to several persons`,
        'it needs NOT NULL and a unique index that is valid, not partial, not deferrable and on this column alone, on an ordinary or partitioned table',
      )
    if (by !== undefined && !sameKeyType(by.type, target.type))
      findings.complain(
        draft.place([...path, 'by']),
        `${key}.${way.by} has type ${by.type.printed}, but ${way.through} has type ${target.type.printed}`,
        'name two columns of the same type',
      )
    const onward = visit(reference.table, [...underway, key])
    if (onward === null || by === undefined) return null
    const step = { column: way.by, table: reference.table, referenced: reference.column }
    return onward.kind === 'column'
      ? { kind: 'through', steps: [step], person: onward.column }
      : { kind: 'through', steps: [step, ...onward.steps], person: onward.person }
  }

  for (const key of tables.owned.keys()) visit(key, [])
  return new Map([...owners].filter((entry): entry is [string, Owner] => entry[1] !== null))
}

/** For each private table the columns that link rows to persons: always in the shell, never in an answer. */
export function linkingColumns(owners: ReadonlyMap<string, Owner>, person: PersonKey): ReadonlyMap<string, ReadonlySet<string>> {
  const linking = new Map<string, Set<string>>()
  const add = (table: string, column: string): void => {
    linking.set(table, (linking.get(table) ?? new Set()).add(column))
  }
  add(person.table, person.column.name)
  for (const [table, owner] of owners) {
    if (owner.kind === 'column') add(table, owner.column)
    let from = table
    for (const step of owner.kind === 'through' ? owner.steps : []) {
      add(from, step.column)
      add(step.table, step.referenced)
      from = step.table
    }
  }
  return linking
}

export function columnOf(table: CatalogTable, name: string): CatalogColumn | undefined {
  return table.columns.find((column) => column.name === name)
}

export function nearColumn(table: CatalogTable, name: string): string {
  return didYouMean(
    name,
    table.columns.map((column) => column.name),
    'name a column of it',
  )
}

function listedName(draft: DraftDataSet, tables: Schemed, key: string): string {
  return Object.keys(draft.content.tables).find((name) => name === key || `${tables.schema}.${name}` === key) ?? key
}
