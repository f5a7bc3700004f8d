import type { Catalog, CatalogTable } from '../catalog/catalog.ts'
import type { Findings } from './complaint.ts'
import { didYouMean } from './near.ts'
import { columnReference, tableKey } from './names.ts'
import type { DraftDataSet } from './read.ts'
import type { OwnedTableFile } from './schema.ts'

/** The tables of a policy beside those of the catalogue, keyed by `schema.table`. */
export interface Schemed {
  /** The schema that unqualified names mean. */
  readonly schema: string
  readonly catalog: ReadonlyMap<string, CatalogTable>
  readonly published: ReadonlySet<string>
  /** The private tables that exist, with what is declared and the name they are listed under. */
  readonly owned: ReadonlyMap<string, { readonly listedAs: string; readonly declared: OwnedTableFile; readonly table: CatalogTable }>
}

/** Looks every listed table up in the catalogue. */
export function schemed(draft: DraftDataSet, catalog: Catalog, findings: Findings): Schemed {
  const schema = draft.content.schema ?? 'public'
  const tables = new Map(catalog.tables.map((table) => [`${table.schema}.${table.name}`, table]))
  const published = new Set<string>()
  const owned = new Map<string, { readonly listedAs: string; readonly declared: OwnedTableFile; readonly table: CatalogTable }>()
  for (const [listedAs, declared] of Object.entries(draft.content.tables)) {
    const key = tableKey(listedAs, schema)
    const table = tables.get(key)
    const place = draft.keyPlace(['tables', listedAs])
    if (table === undefined) {
      const known = [...tables.values()].map((each) => (each.schema === schema ? each.name : `${each.schema}.${each.name}`))
      findings.complain(place, `the vault has no table ${key}`, didYouMean(listedAs, known, 'remove it, or grant USAGE on its schema to the role of the vault'))
    } else if (table.kind === 'other') {
      findings.complain(place, `${key} is not a table or a view`, 'list a table, a view or a foreign table')
    } else if ('published' in declared) {
      published.add(key)
    } else {
      owned.set(key, { listedAs, declared, table })
    }
  }
  return { schema, catalog: tables, published, owned }
}

/** Why a table may hold data about persons, for each that may: listed as private, or tied to such a table by a foreign key or a view, over any number of others. */
export function personalTables(draft: DraftDataSet, catalog: Catalog, tables: Schemed): ReadonlyMap<string, string> {
  const personTable = columnReference(draft.content.person.key, tables.schema).table
  const reasons = new Map<string, string>([[personTable, 'it holds the person key']])
  for (const key of tables.owned.keys()) if (!reasons.has(key)) reasons.set(key, 'it is private')
  for (let before = -1; before !== reasons.size;) {
    before = reasons.size
    for (const table of catalog.tables) {
      const key = `${table.schema}.${table.name}`
      if (reasons.has(key)) continue
      const reason = tieToPersons(table, reasons)
      if (reason !== null) reasons.set(key, reason)
    }
  }
  return reasons
}

function tieToPersons(table: CatalogTable, personal: ReadonlyMap<string, string>): string | null {
  for (const key of table.foreignKeys) {
    const referenced = `${key.schema}.${key.table}`
    if (personal.has(referenced)) return `its foreign key (${key.columns.join(', ')}) refers to ${referenced}`
  }
  for (const read of table.readsFrom) {
    if (personal.has(read)) return `it reads ${read}`
    if (read.endsWith('()')) return `it calls ${read}, and what a function reads cannot be seen`
  }
  return null
}

/** INVARIANT UNIQUE: the column is alone in a unique key that design and catalogue can prove; views, foreign and inherited tables prove nothing. */
export function isProvedUnique(table: CatalogTable, column: string): boolean {
  return (table.kind === 'ordinary' || table.kind === 'partitioned') && table.uniqueKeys.some((key) => key.length === 1 && key[0] === column)
}
