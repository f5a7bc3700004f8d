import type pg from 'pg'
import type { Policies } from '../policy/data-set.ts'
import { LobbyProblem } from './problem.ts'
import { name, names } from './quote.ts'
import { rowsOf, sqlstateOf } from './session.ts'
import { setOn } from './settings-of.ts'

/** Makes the data sets' databases that are missing: UTF8, code-point order. Returns the names of the new ones. */
export async function createDatabases(client: pg.Client, wanted: readonly string[]): Promise<readonly string[]> {
  const rows = await rowsOf(client, 'SELECT datname, pg_catalog.pg_encoding_to_char(encoding) FROM pg_catalog.pg_database WHERE datname = ANY ($1::text[])', [
    wanted,
  ])
  const encodings = new Map(rows.map(([database, encoding]) => [database, encoding]))
  const created: string[] = []
  for (const database of wanted) {
    const encoding = encodings.get(database)
    if (encoding === undefined) {
      await createDatabase(client, database)
      created.push(database)
    } else if (encoding !== 'UTF8') {
      throw new LobbyProblem(`the lobby's database ${database} is encoded in ${encoding}`, 'drop it, so that it is made anew in UTF8')
    }
  }
  return created
}

async function createDatabase(client: pg.Client, database: string): Promise<void> {
  const [row] = await rowsOf(client, "SELECT pg_catalog.current_setting('server_version_num')")
  const builtin = Number(row?.[0] ?? 0) >= 170000
  const base = `CREATE DATABASE ${name(database)} TEMPLATE template0 ENCODING 'UTF8'`
  if (builtin) {
    await client.query(`${base} LOCALE_PROVIDER builtin BUILTIN_LOCALE 'C.UTF-8' LC_COLLATE 'C' LC_CTYPE 'C'`)
    return
  }
  try {
    await client.query(`${base} LC_COLLATE 'C.UTF-8' LC_CTYPE 'C.UTF-8'`)
  } catch (error) {
    // 42809: the server's system has no such locale.
    if (sqlstateOf(error) !== '42809' && sqlstateOf(error) !== '22023') throw error
    await client.query(`${base} LC_COLLATE 'C' LC_CTYPE 'C'`)
  }
}

/**
 * INVARIANT OWN DATABASES ONLY: an analyst may connect to the databases of the own data sets, and to no other on this server. What PUBLIC loses on a
 * database that is not Hedgerow's is given by name to the other log-in roles that had it through PUBLIC.
 * Returns what stayed open because the database is somebody else's.
 */
export async function closeDatabases(client: pg.Client, policies: Policies, analysts: readonly string[]): Promise<readonly string[]> {
  const others = await otherRoles(client, analysts)
  for (const database of await openDatabases(client)) {
    try {
      if (!policies.dataSets.has(database) && others.length > 0)
        await client.query(`GRANT CONNECT, TEMPORARY ON DATABASE ${name(database)} TO ${names(others)}`)
      await client.query(`REVOKE ALL ON DATABASE ${name(database)} FROM PUBLIC`)
    } catch (error) {
      // 3D000: it was dropped in the meantime.
      if (sqlstateOf(error) !== '3D000') throw error
    }
  }
  await revokeForeignGrants(client, policies, analysts)
  for (const analyst of policies.analysts.values()) {
    for (const database of analyst.data.keys()) {
      if (policies.dataSets.has(database)) await client.query(`GRANT CONNECT, TEMPORARY ON DATABASE ${name(database)} TO ${name(analyst.name)}`)
    }
  }
  for (const database of policies.dataSets.keys()) await client.query(`GRANT CONNECT ON DATABASE ${name(database)} TO hedgerow_reader`)
  return (await openDatabases(client)).map(
    (database) =>
      `the database ${database} stays open to every role of the lobby's server: its owner must run REVOKE CONNECT ON DATABASE ${name(database)} FROM PUBLIC`,
  )
}

async function openDatabases(client: pg.Client): Promise<readonly string[]> {
  const rows = await rowsOf(
    client,
    `SELECT DISTINCT d.datname FROM pg_catalog.pg_database d,
            LATERAL pg_catalog.aclexplode(coalesce(d.datacl, pg_catalog.acldefault('d', d.datdba))) a WHERE a.grantee = 0 ORDER BY 1`,
  )
  return rows.map(([database]) => database ?? '')
}

async function otherRoles(client: pg.Client, analysts: readonly string[]): Promise<readonly string[]> {
  const rows = await rowsOf(
    client,
    `SELECT rolname FROM pg_catalog.pg_roles WHERE rolcanlogin AND NOT rolsuper AND rolname <> ALL ($1::text[]) AND rolname !~ '^hedgerow_(owner|reader)$'
        AND rolname <> current_user ORDER BY 1`,
    [analysts],
  )
  return rows.map(([role]) => role ?? '')
}

async function revokeForeignGrants(client: pg.Client, policies: Policies, analysts: readonly string[]): Promise<void> {
  const rows = await rowsOf(
    client,
    `SELECT DISTINCT d.datname, r.rolname FROM pg_catalog.pg_database d, LATERAL pg_catalog.aclexplode(d.datacl) a JOIN pg_catalog.pg_roles r ON r.oid = a.grantee
      WHERE r.rolname = ANY ($1::text[])`,
    [analysts],
  )
  for (const [database, role] of rows) {
    const wanted = policies.dataSets.has(database ?? '') && policies.analysts.get(role ?? '')?.data.has(database ?? '') === true
    if (!wanted) await client.query(`REVOKE ALL ON DATABASE ${name(database ?? '')} FROM ${name(role ?? '')}`)
  }
}

/** Defaults of the hedgerow.* settings and the search path of a data set's database; everything else that was set there is reset. */
export async function setDatabaseDefaults(client: pg.Client, policies: Policies, superuser: boolean, warn: (text: string) => void): Promise<void> {
  for (const dataSet of policies.dataSets.values()) {
    const database = name(dataSet.name)
    const path = dataSet.schema === 'public' ? 'public' : `${name(dataSet.schema)}, public`
    await client.query(`ALTER DATABASE ${database} RESET ALL`)
    await client.query(`ALTER DATABASE ${database} SET search_path = ${path}`)
    const defaults: readonly (readonly [string, string])[] = [
      ['hedgerow.epsilon', dataSet.defaults.epsilon],
      ['hedgerow.delta', dataSet.defaults.delta],
      ['hedgerow.margin', ''],
      ['hedgerow.confidence', '0.95'],
      ['hedgerow.noise', 'auto'],
      ['hedgerow.groups', ''],
      ['hedgerow.rows', ''],
      ['hedgerow.replay', 'off'],
      ['hedgerow.nonnegative', 'off'],
    ]
    await setOn(client, `DATABASE ${database}`, defaults, superuser, warn)
  }
}
