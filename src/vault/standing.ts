import type { Pool } from 'pg'
import { oldestServer } from './catalog.ts'
import { asText } from './connections.ts'
import type { TextRow } from './connections.ts'

/** Why the vault cannot be used; for the operator. It never holds a server's text. */
export class VaultUnfit extends Error {
  override readonly name = 'VaultUnfit'
}

/** What the vault's server and the role Hedgerow logs in as allow. */
export interface Standing {
  readonly serverVersion: number
  /** Rights the role does not need, one sentence each. */
  readonly warnings: readonly string[]
  /** Whether the server itself can notice that its client is gone while a query runs. */
  readonly noticesLostClients: boolean
}

const roleSql = `
  select current_setting('server_version_num'), current_user, r.rolsuper, r.rolcreaterole or r.rolcreatedb, r.rolreplication, r.rolbypassrls,
         exists (select from pg_class c join pg_namespace n on n.oid = c.relnamespace
                  where c.relkind in ('r', 'p', 'v', 'f') and n.nspname !~ '^pg_' and n.nspname <> 'information_schema'
                    and has_table_privilege(c.oid, 'INSERT, UPDATE, DELETE, TRUNCATE')),
         exists (select from pg_roles g where g.rolname in ('pg_write_server_files', 'pg_read_server_files', 'pg_execute_server_program') and pg_has_role(current_user, g.oid, 'member'))
    from pg_roles r where r.rolname = current_user`

/** Looks at server and role once at the start; a VaultUnfit where the vault cannot be reached or is too old. */
export async function readStanding(pool: Pool): Promise<Standing> {
  const [version, role, superuser, makesRoles, replicates, bypasses, writes, files] = await firstRow(pool)
  const serverVersion = parseInt(version ?? '', 10)
  if (!(serverVersion >= oldestServer * 10_000)) throw new VaultUnfit(`the vault must be PostgreSQL ${oldestServer} or newer`)
  const may: readonly (readonly [string | null | undefined, string])[] = [
    [superuser, 'is a superuser'],
    [superuser === 't' ? 'f' : writes, 'may change tables'],
    [superuser === 't' ? 'f' : makesRoles, 'may make roles or databases'],
    [superuser === 't' ? 'f' : replicates, 'may replicate'],
    [superuser === 't' ? 'f' : files, `may use the server's files or programs`],
  ]
  const warnings = may
    .filter(([held]) => held === 't')
    .map(([, right]) => `the vault's role ${role} ${right}: give Hedgerow a role that may only SELECT the listed tables`)
  if (superuser !== 't' && bypasses === 't') warnings.push(`the vault's role ${role} passes by row security: rows that a policy of the vault hides are counted`)
  const noticesLostClients = await pool.query(`select set_config('client_connection_check_interval', '500ms', false)`).then(
    () => true,
    () => false,
  )
  return { serverVersion, warnings, noticesLostClients }
}

async function firstRow(pool: Pool): Promise<TextRow> {
  try {
    const { rows } = await pool.query<(string | null)[]>({ text: roleSql, rowMode: 'array', types: asText })
    return rows[0] ?? []
  } catch (error) {
    const code: unknown = typeof error === 'object' && error !== null && 'code' in error ? error.code : null
    throw new VaultUnfit(`the vault cannot be reached: ${reasons.get(String(code)) ?? `error ${typeof code === 'string' ? code : 'without a code'}`}`)
  }
}

const reasons: ReadonlyMap<string, string> = new Map([
  ['28P01', 'the password was not accepted'],
  ['28000', `the server's pg_hba.conf or its roles do not admit this log-in`],
  ['3D000', 'there is no database of that name'],
  ['53300', 'the server has no connection left'],
  ['57P03', 'the server is starting or stopping'],
  ['ECONNREFUSED', 'nothing listens at that host and port'],
  ['ENOTFOUND', 'that host is not known'],
  ['ETIMEDOUT', 'that host does not answer'],
])
