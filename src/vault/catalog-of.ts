import pg from 'pg'
import type { Catalog } from '../catalog/catalog.ts'
import { readCatalog } from './catalog.ts'

const connectMs = 10_000
const statementMs = 30_000

/** Reads the catalogue of the vault at `url` on a connection of its own, in a read-only transaction. Throws what `pg` throws. */
export function catalogOf(url: string): (schemas: readonly string[]) => Promise<Catalog> {
  return async (schemas) => {
    const client = new pg.Client({ connectionString: url, connectionTimeoutMillis: connectMs, application_name: 'hedgerow', statement_timeout: statementMs })
    client.on('error', () => undefined)
    try {
      await client.connect()
      await client.query('BEGIN ISOLATION LEVEL REPEATABLE READ READ ONLY')
      const catalog = await readCatalog(client, schemas)
      await client.query('COMMIT')
      return catalog
    } finally {
      await client.end()
    }
  }
}
