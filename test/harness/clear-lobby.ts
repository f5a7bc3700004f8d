import pg from 'pg'

/**
 * Takes away what an earlier lobby of the tests left on a server that outlives them: the databases in which Hedgerow's own role has anything, and the roles it made.
 * Does nothing on a server without one.
 */
export async function clearLobby(maintenance: pg.Client): Promise<void> {
  const databases = await maintenance.query<{ datname: string }>(
    `SELECT DISTINCT d.datname FROM pg_shdepend s JOIN pg_database d ON d.oid = s.dbid JOIN pg_roles r ON r.oid = s.refobjid AND s.refclassid = 'pg_authid'::regclass
     WHERE r.rolname IN ('hedgerow_owner', 'hedgerow_reader') AND NOT d.datistemplate AND d.datname <> current_database()`,
  )
  for (const { datname } of databases.rows) await maintenance.query(`DROP DATABASE IF EXISTS ${pg.escapeIdentifier(datname)} WITH (FORCE)`)
  const roles = await maintenance.query<{ rolname: string }>(
    `SELECT rolname FROM pg_roles WHERE rolname IN ('hedgerow_owner', 'hedgerow_reader') OR shobj_description(oid, 'pg_authid') LIKE '%Hedgerow%'`,
  )
  for (const { rolname } of roles.rows) await maintenance.query(`DROP OWNED BY ${pg.escapeIdentifier(rolname)}; DROP ROLE ${pg.escapeIdentifier(rolname)}`)
  if (roles.rows.length > 0) await maintenance.query('GRANT CONNECT, TEMPORARY ON DATABASE postgres TO PUBLIC')
}
