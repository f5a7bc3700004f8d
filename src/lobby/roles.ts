import type pg from 'pg'
import type { Policies } from '../policy/data-set.ts'
import { LobbyProblem } from './problem.ts'
import { literal, name } from './quote.ts'
import { rowsOf } from './session.ts'
import { setOn } from './settings-of.ts'

/** What an analyst's sessions may use of the lobby. Times and sizes as PostgreSQL writes them: '5min', '1GB'. */
export interface AnalystLimits {
  readonly statementTimeout: string
  readonly tempFileLimit: string
  readonly workMem: string
  readonly connections: number
}

export const defaultLimits: AnalystLimits = { statementTimeout: '5min', tempFileLimit: '2GB', workMem: '16MB', connections: 20 }

/** hedgerow_owner owns shells, copies and functions; as hedgerow_reader Hedgerow sees the names an analyst sees. Nobody logs in as one of them. */
const ownRoles = ['hedgerow_owner', 'hedgerow_reader'] as const

/**
 * The comment that tells an analyst's role from others. It is no membership of a common role: members could drop what such a role was granted, for all.
 * So a data set's objects are granted to PUBLIC, by INVARIANT OWN DATABASES ONLY.
 */
const mark = 'an analyst, kept by Hedgerow'

export interface RoleOutcome {
  /** Every analyst this lobby knows, those that left the policy included. */
  readonly analysts: readonly string[]
  readonly removed: readonly string[]
}

/** Makes the two roles of Hedgerow's own, without log-in. */
export async function installOwnRoles(client: pg.Client, superuser: boolean): Promise<void> {
  for (const role of ownRoles) {
    const found = await rowsOf(client, 'SELECT FROM pg_catalog.pg_roles WHERE rolname = $1', [role])
    if (found.length === 0) await client.query(`CREATE ROLE ${role} NOLOGIN`)
    await client.query(`ALTER ROLE ${role} NOLOGIN NOCREATEDB NOCREATEROLE ${superuser ? 'NOSUPERUSER NOREPLICATION NOBYPASSRLS ' : ''}PASSWORD NULL`)
    if (!superuser) await client.query(`GRANT ${role} TO CURRENT_USER`)
  }
}

/** Every analyst made by an earlier load, and those of the policy. */
export async function knownAnalysts(client: pg.Client, policies: Policies): Promise<RoleOutcome> {
  const marked = await rowsOf(client, "SELECT rolname FROM pg_catalog.pg_roles WHERE pg_catalog.shobj_description(oid, 'pg_authid') = $1 ORDER BY 1", [mark])
  const made = marked.map(([role]) => role ?? '')
  return { analysts: [...new Set([...made, ...policies.analysts.keys()])], removed: made.filter((role) => !policies.analysts.has(role)) }
}

/**
 * INVARIANT ANALYSTS AS DECLARED: after each load an analyst's role has the policy's password, attributes, memberships and settings and no others, whatever
 * the analyst changed about it; who left the policy can no longer log in.
 */
export async function installAnalysts(
  client: pg.Client,
  policies: Policies,
  known: RoleOutcome,
  limits: AnalystLimits,
  superuser: boolean,
  warn: (text: string) => void,
): Promise<void> {
  for (const role of known.removed) await client.query(`ALTER ROLE ${name(role)} NOLOGIN PASSWORD NULL`)
  for (const analyst of policies.analysts.values()) {
    await createAnalyst(client, analyst.name, superuser)
    await revokeMemberships(client, analyst.name)
    const login = analyst.login === null ? 'NOLOGIN PASSWORD NULL' : `LOGIN PASSWORD ${literal(analyst.login)}`
    const attributes = `NOINHERIT NOCREATEDB NOCREATEROLE ${superuser ? 'NOSUPERUSER NOREPLICATION NOBYPASSRLS ' : ''}CONNECTION LIMIT ${limits.connections} VALID UNTIL 'infinity'`
    await client.query(`ALTER ROLE ${name(analyst.name)} ${attributes} ${login}`)
    await putBackSettings(client, analyst.name, limits, superuser, warn)
  }
}

async function createAnalyst(client: pg.Client, role: string, superuser: boolean): Promise<void> {
  const [found] = await rowsOf(client, "SELECT pg_catalog.shobj_description(oid, 'pg_authid') FROM pg_catalog.pg_roles WHERE rolname = $1", [role])
  if (found === undefined) {
    await client.query(`CREATE ROLE ${name(role)} NOLOGIN`)
    await client.query(`COMMENT ON ROLE ${name(role)} IS ${literal(mark)}`)
    // Who is no superuser ends only sessions of roles it is a member of.
    if (!superuser) await client.query(`GRANT ${name(role)} TO CURRENT_USER`)
  } else if (found[0] !== mark) {
    throw new LobbyProblem(`the lobby's server has a role ${role} that Hedgerow did not make`, `drop that role or give the analyst ${role} another name`)
  }
}

async function revokeMemberships(client: pg.Client, role: string): Promise<void> {
  const rows = await rowsOf(
    client,
    `SELECT g.rolname, r.rolname FROM pg_catalog.pg_auth_members m JOIN pg_catalog.pg_roles g ON g.oid = m.roleid JOIN pg_catalog.pg_roles r ON r.oid = m.member
      WHERE r.rolname = $1 OR (g.rolname = $1 AND r.rolname <> current_user)`,
    [role],
  )
  for (const [group, member] of rows) await client.query(`REVOKE ${name(group ?? '')} FROM ${name(member ?? '')}`)
}

async function putBackSettings(client: pg.Client, role: string, limits: AnalystLimits, superuser: boolean, warn: (text: string) => void): Promise<void> {
  await client.query(`ALTER ROLE ${name(role)} RESET ALL`)
  const rows = await rowsOf(
    client,
    `SELECT d.datname FROM pg_catalog.pg_db_role_setting s JOIN pg_catalog.pg_database d ON d.oid = s.setdatabase
       JOIN pg_catalog.pg_roles r ON r.oid = s.setrole WHERE r.rolname = $1`,
    [role],
  )
  for (const [database] of rows) await client.query(`ALTER ROLE ${name(role)} IN DATABASE ${name(database ?? '')} RESET ALL`)
  await setOn(client, `ROLE ${name(role)}`, Object.entries(roleSettings(limits)), superuser, warn)
}

/** The server's log must not keep what analysts write: literals in a statement can be about people, and a DO block can log anything. */
function roleSettings(limits: AnalystLimits): Readonly<Record<string, string>> {
  return {
    row_security: 'off',
    statement_timeout: limits.statementTimeout,
    work_mem: limits.workMem,
    temp_file_limit: limits.tempFileLimit,
    client_connection_check_interval: '500ms',
    log_statement: 'none',
    log_duration: 'off',
    log_min_duration_statement: '-1',
    log_min_duration_sample: '-1',
    log_transaction_sample_rate: '0',
    log_min_error_statement: 'panic',
    log_min_messages: 'fatal',
  }
}

/** Ends the sessions of analysts in databases they may not be in, and of analysts without log-in. Returns whose. */
export async function endStrayedSessions(client: pg.Client, analysts: readonly string[]): Promise<readonly string[]> {
  const rows = await rowsOf(
    client,
    `SELECT a.usename, pg_catalog.pg_terminate_backend(a.pid) FROM pg_catalog.pg_stat_activity a JOIN pg_catalog.pg_roles r ON r.oid = a.usesysid
      WHERE a.usename = ANY ($1::text[]) AND a.datname IS NOT NULL AND (NOT r.rolcanlogin OR NOT pg_catalog.has_database_privilege(r.oid, a.datid, 'CONNECT'))`,
    [analysts],
  )
  return rows.map(([role]) => role ?? '')
}
