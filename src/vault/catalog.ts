import type { Catalog, CatalogTable } from '../catalog/catalog.ts'
import { relationsSql, serverSql } from './catalog-sql.ts'

/** As much of a `pg` client as the reader needs; every value asked for is text, so the client's type parsers do not matter. */
export interface CatalogClient {
  query(query: { readonly text: string; readonly values?: unknown[]; readonly rowMode: 'array' }): Promise<{ readonly rows: readonly (readonly unknown[])[] }>
}

/** The first and the last server whose pg_catalog the reader was written for: above the last is tried, below the first is refused. */
export const oldestServer = 13

/**
 * The shape of the relations in `schemas` and in every schema they lead to, from pg_catalog alone: no row of a table is read. Throws an Error for a server that is too old, and whatever the client
 * throws. A `readsFrom` entry that ends in `()` is a function that a view calls; inheritance children and partitions count as read by their parent.
 */
export async function readCatalog(client: CatalogClient, schemas: readonly string[]): Promise<Catalog> {
  const server = await client.query({ text: serverSql, rowMode: 'array' })
  const [systemIdentifier, version] = (server.rows[0] ?? []).map(String)
  const serverVersion = Number(version)
  if (systemIdentifier === undefined || !(serverVersion >= oldestServer * 10_000)) throw new Error(`the vault must be PostgreSQL ${oldestServer} or newer`)
  for (let wanted: ReadonlySet<string> = new Set(schemas); ;) {
    const relations = await client.query({ text: relationsSql, values: [[...wanted]], rowMode: 'array' })
    const tables = relations.rows.map((row) => JSON.parse(String(row[0])) as CatalogTable)
    const wider = new Set([...wanted, ...tables.flatMap(schemasReached)])
    if (wider.size === wanted.size) return { systemIdentifier, serverVersion, tables }
    wanted = wider
  }
}

/** Where a table's foreign keys and a view's sources lie: what they lead to has to be known as well, to tell whether it is about persons. */
function schemasReached(table: CatalogTable): readonly string[] {
  return [
    ...table.foreignKeys.map((key) => key.schema),
    ...table.readsFrom.filter((read) => !read.endsWith('()')).map((read) => read.slice(0, read.indexOf('.'))),
  ]
}
