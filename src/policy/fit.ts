import type { Catalog, CatalogTable } from '../catalog/catalog.ts'
import { Findings } from './complaint.ts'
import type { Outcome } from './complaint.ts'
import type { DataColumn, DataSet, DataTable, Owner, PrivateTable, PublishedTable } from './data-set.ts'
import { milliseconds } from './fields.ts'
import { fitBounds } from './fit-bounds.ts'
import { fitColumn, plainColumn } from './fit-column.ts'
import { columnOf, fitOwners, fitPersonKey, linkingColumns, nearColumn } from './fit-owner.ts'
import type { PersonKey } from './fit-owner.ts'
import { isProvedUnique, personalTables, schemed } from './fit-tables.ts'
import type { Schemed } from './fit-tables.ts'
import type { DraftDataSet } from './read.ts'

/** What a statement spends, and when it is answered, where the policy does not say. */
const defaults = { epsilon: '0.1', delta: '1e-8', replyAfter: '0.3s' }

/** Holds a data set's policy against the vault's catalogue: the data set the planner works from, or everything that does not fit. */
export function fit(draft: DraftDataSet, catalog: Catalog): Outcome<DataSet> {
  const findings = new Findings()
  const { content } = draft
  const tables = schemed(draft, catalog, findings)
  const person = fitPersonKey(draft, tables, findings)
  const owners = fitOwners(draft, tables, person?.column.type ?? null, findings)
  const fitted = new Map<string, DataTable>()
  complainOfPublished(draft, catalog, tables, findings)
  for (const key of tables.published) {
    const table = tables.catalog.get(key)
    if (table !== undefined) fitted.set(key, publishedTable(table))
  }
  if (person !== null) {
    const linking = linkingColumns(owners, person)
    for (const key of tables.owned.keys()) {
      const table = privateTable(draft, tables, owners, person, linking, key, findings)
      if (table !== null) fitted.set(key, table)
    }
  }
  return findings.outcome(() => {
    const key = person as PersonKey
    return {
      name: content.dataset,
      policyHash: draft.policyHash,
      schema: tables.schema,
      personCalled: content.person.called,
      personTable: key.table,
      personColumn: key.column.name,
      personType: key.column.type,
      defaults: { epsilon: content.defaults?.epsilon ?? defaults.epsilon, delta: content.defaults?.delta ?? defaults.delta },
      replyAfterMs: milliseconds(content.reply_after ?? defaults.replyAfter),
      personKey: `${catalog.systemIdentifier}/${key.table}.${key.column.name}`,
      tables: inPolicyOrder(draft, tables, fitted),
      hasUndeclaredKeys: [...fitted.values()].some((table) => table.kind === 'private' && [...table.columns.values()].some(isUndeclaredKey)),
    }
  })
}

/** Whether grouping by the column as it stands would need its keys selected at the price of some delta. */
function isUndeclaredKey(column: DataColumn): boolean {
  return (
    column.role === 'listed' && column.values === null && column.valuesFrom === null && !(column.type.schema === 'pg_catalog' && column.type.name === 'bool')
  )
}

function complainOfPublished(draft: DraftDataSet, catalog: Catalog, tables: Schemed, findings: Findings): void {
  const personal = personalTables(draft, catalog, tables)
  for (const listedAs of Object.keys(draft.content.tables)) {
    const key = listedAs.includes('.') ? listedAs : `${tables.schema}.${listedAs}`
    const reason = tables.published.has(key) ? personal.get(key) : undefined
    if (reason === undefined || reason === 'it holds the person key') continue
    findings.complain(
      draft.keyPlace(['tables', listedAs]),
      `${key} cannot be published: ${reason}`,
      'list it as private with its person, or copy what may be public into a table of its own',
    )
  }
}

function publishedTable(table: CatalogTable): PublishedTable {
  return {
    kind: 'published',
    schema: table.schema,
    name: table.name,
    columns: new Map(table.columns.map((column) => [column.name, plainColumn(column, 'listed')])),
    uniqueKeys: provedKeys(table),
    primaryKey: table.primaryKey,
  }
}

/** As the table has them, and so its shell: what a star means, and which column a renaming alias names. */
function inOrder(columns: ReadonlyMap<string, DataColumn>, table: CatalogTable): ReadonlyMap<string, DataColumn> {
  return new Map(
    table.columns.flatMap(({ name }) => {
      const column = columns.get(name)
      return column === undefined ? [] : [[name, column] as const]
    }),
  )
}

function privateTable(
  draft: DraftDataSet,
  tables: Schemed,
  owners: ReadonlyMap<string, Owner>,
  person: PersonKey,
  linking: ReadonlyMap<string, ReadonlySet<string>>,
  key: string,
  findings: Findings,
): PrivateTable | null {
  const listed = tables.owned.get(key)
  if (listed === undefined) return null
  const { table, declared, listedAs } = listed
  const owner = owners.get(key)
  const links = linking.get(key) ?? new Set<string>()
  const columns = new Map<string, DataColumn>()
  for (const column of table.columns) if (links.has(column.name)) columns.set(column.name, plainColumn(column, 'linking'))
  for (const [name, written] of Object.entries(declared.columns ?? {})) {
    const path = ['tables', listedAs, 'columns', name]
    const column = columnOf(table, name)
    const declarations = written ?? {}
    if (column === undefined) {
      findings.complain(draft.keyPlace(path), `${key} has no column ${name}`, nearColumn(table, name))
    } else if (links.has(name)) {
      const first = Object.keys(declarations).find((each) => each !== 'also_identifies')
      if (first !== undefined)
        findings.complain(
          draft.keyPlace([...path, first]),
          `${key}.${name} links rows to persons and can carry no declarations`,
          'leave the column out: it can be joined on, and is never shown',
        )
    } else {
      if (declarations.also_identifies === undefined) complainOfSecondPerson(draft, table, owner, person, listedAs, name, findings)
      columns.set(name, fitColumn({ findings, place: draft.place, keyPlace: draft.keyPlace, path, label: `${key}.${name}`, tables }, column, declarations))
    }
  }
  const onePerPerson = owner?.kind === 'column' && isProvedUnique(table, owner.column)
  const bounds = fitBounds(draft, tables, owners, key, onePerPerson, findings)
  if (owner === undefined) return null
  return {
    kind: 'private',
    schema: table.schema,
    name: table.name,
    owner,
    bounds,
    onePerPerson,
    columns: inOrder(columns, table),
    uniqueKeys: provedKeys(table),
    primaryKey: table.primaryKey,
  }
}

/** A row about two persons protects only the one it belongs to: that has to be said. */
function complainOfSecondPerson(
  draft: DraftDataSet,
  table: CatalogTable,
  owner: Owner | undefined,
  person: PersonKey,
  listedAs: string,
  column: string,
  findings: Findings,
): void {
  const key = table.foreignKeys.find(
    (each) =>
      each.columns.includes(column) && `${each.schema}.${each.table}` === person.table && !(owner?.kind === 'column' && each.columns.includes(owner.column)),
  )
  if (key === undefined) return
  findings.complain(
    draft.keyPlace(['tables', listedAs, 'columns', column]),
    `${table.schema}.${table.name}.${column} refers to a second ${draft.content.person.called} by a foreign key to ${person.table}, whom this row does not protect`,
    `leave the column out, or write ${column}: { also_identifies: accepted }`,
  )
}

/** By INVARIANT UNIQUE only ordinary and partitioned tables prove anything. */
function provedKeys(table: CatalogTable): CatalogTable['uniqueKeys'] {
  return table.kind === 'ordinary' || table.kind === 'partitioned' ? table.uniqueKeys : []
}

function inPolicyOrder(draft: DraftDataSet, tables: Schemed, fitted: ReadonlyMap<string, DataTable>): ReadonlyMap<string, DataTable> {
  const keys = Object.keys(draft.content.tables).map((name) => (name.includes('.') ? name : `${tables.schema}.${name}`))
  return new Map(keys.flatMap((key) => (fitted.has(key) ? [[key, fitted.get(key) as DataTable] as const] : [])))
}
