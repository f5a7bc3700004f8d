import pg from 'pg'

/** Rows as PostgreSQL prints them: every value its own text, NULL as null. */
export type TextRow = readonly (string | null)[]

const asText = { getTypeParser: () => (value: unknown) => value } as unknown as pg.CustomTypesConfig

/** The same server and user, another database. */
export function urlOf(url: string, database: string): string {
  const changed = new URL(url)
  changed.pathname = `/${encodeURIComponent(database)}`
  return changed.toString()
}

/** One connection of Hedgerow's own; values arrive as text. The caller ends it. */
export async function openSession(url: string, settings: Readonly<Record<string, string>> = {}): Promise<pg.Client> {
  const client = new pg.Client({ connectionString: url, types: asText, connectionTimeoutMillis: 10_000, application_name: 'hedgerow', keepAlive: true })
  // A connection that dies while idle reports itself here; the next query on it fails by itself.
  client.on('error', () => undefined)
  await client.connect()
  try {
    if (Object.keys(settings).length > 0)
      await client.query('SELECT pg_catalog.set_config(key, value, false) FROM pg_catalog.jsonb_each_text($1::jsonb)', [JSON.stringify(settings)])
  } catch (error) {
    await client.end().catch(() => undefined)
    throw error
  }
  return client
}

/** The rows of one query, as text. */
export async function rowsOf(client: pg.ClientBase, text: string, values: readonly unknown[] = []): Promise<readonly TextRow[]> {
  const result = await client.query<(string | null)[]>({ text, values: [...values], rowMode: 'array' })
  return result.rows
}

/** All or nothing; `work` runs between BEGIN and COMMIT. */
export async function inTransaction<T>(client: pg.ClientBase, begin: string, work: () => Promise<T>): Promise<T> {
  await client.query(begin)
  try {
    const value = await work()
    await client.query('COMMIT')
    return value
  } catch (error) {
    await client.query('ROLLBACK').catch(() => undefined)
    throw error
  }
}

/** The SQLSTATE of a server's error, '' for anything else. */
export function sqlstateOf(error: unknown): string {
  return error instanceof pg.DatabaseError ? (error.code ?? '') : ''
}
