import type pg from 'pg'
import { rowsOf } from './session.ts'

/**
 * What no analyst needs and some could misuse: large objects (a store shared by all), advisory locks (a way to hold others up), messages in the write-ahead
 * log, exported snapshots, and the functions that run a text as a query and so read past the gate.
 */
const closedNames = '^(lo_.*|loread|lowrite|pg_(try_)?advisory_.*|pg_logical_emit_message|pg_export_snapshot|(table|query|cursor|schema|database)_to_xml.*)$'

/** Takes EXECUTE on them from PUBLIC in this database. Returns the signatures that stayed open, because their owner is somebody else. */
export function closeFunctions(client: pg.Client): Promise<readonly string[]> {
  return closeMatching(client, 'pg_catalog', closedNames)
}

/** The same for the functions of a schema whose names match `pattern`. */
export async function closeMatching(client: pg.Client, schema: string, pattern: string): Promise<readonly string[]> {
  for (const signature of await openFunctions(client, schema, pattern)) await client.query(`REVOKE EXECUTE ON FUNCTION ${signature} FROM PUBLIC`)
  return openFunctions(client, schema, pattern)
}

async function openFunctions(client: pg.Client, schema: string, pattern: string): Promise<readonly string[]> {
  const rows = await rowsOf(
    client,
    `SELECT p.oid::regprocedure::text FROM pg_catalog.pg_proc p, LATERAL pg_catalog.aclexplode(coalesce(p.proacl, pg_catalog.acldefault('f', p.proowner))) a
      WHERE p.pronamespace = $1::regnamespace AND p.prokind = 'f' AND p.proname ~ $2 AND a.grantee = 0 ORDER BY 1`,
    [schema, pattern],
  )
  return rows.map(([signature]) => signature ?? '')
}
