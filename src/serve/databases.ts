import pg from 'pg'

/** The connection string for another database of the same server. */
export function withDatabase(url: string, database: string): string {
  const changed = new URL(url)
  changed.pathname = `/${encodeURIComponent(database)}`
  return changed.href
}

/** Makes a database where it is missing, and closes it to everybody but its owner. */
export async function ensureDatabase(url: string, database: string): Promise<string> {
  const client = new pg.Client({ connectionString: url })
  client.on('error', () => undefined)
  await client.connect()
  try {
    const found = await client.query('SELECT FROM pg_catalog.pg_database WHERE datname = $1', [database])
    if (found.rowCount === 0) await client.query(`CREATE DATABASE ${pg.escapeIdentifier(database)} TEMPLATE template0 ENCODING 'UTF8'`)
    await client.query(`REVOKE ALL ON DATABASE ${pg.escapeIdentifier(database)} FROM PUBLIC`)
  } finally {
    await client.end()
  }
  return withDatabase(url, database)
}
