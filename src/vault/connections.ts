import { Pool } from 'pg'
import type { PoolClient } from 'pg'
import type { Log } from '../base/ports.ts'

export type TextRow = readonly (string | null)[]

/** Every value as the text the server sent. */
export const asText = {
  getTypeParser:
    () =>
    (value: string): string =>
      value,
}

/** What holds for every connection to the vault, so that a value prints and a name resolves the same way whatever the role's own settings say. */
const options = [
  'search_path=pg_catalog,pg_temp',
  'datestyle=ISO',
  'intervalstyle=postgres',
  'extra_float_digits=1',
  'bytea_output=hex',
  'standard_conforming_strings=on',
  'transform_null_equals=off',
  'jit=off',
  'default_transaction_read_only=on',
]

/** Pools to the vault: one to ask, a small one, always warm, from which a running query is cancelled. */
export interface VaultConnections {
  readonly asking: Pool
  /** Stops what the backend is running. Never throws. */
  cancel(pid: string): Promise<void>
  close(): Promise<void>
}

export interface ConnectionOptions {
  readonly url: string
  readonly maxConnections: number
  readonly waitMs: number
  readonly log: Log
}

export function openVaultConnections({ url, maxConnections, waitMs, log }: ConnectionOptions): VaultConnections {
  const shared = { connectionString: url, connectionTimeoutMillis: waitMs, keepAlive: true, options: options.map((setting) => `-c ${setting}`).join(' ') }
  const asking = new Pool({ ...shared, max: maxConnections, application_name: 'hedgerow', pipeline: true, idle_in_transaction_session_timeout: 60_000 })
  const cancelling = new Pool({ ...shared, max: 2, application_name: 'hedgerow cancel', idleTimeoutMillis: 0, statement_timeout: 5_000 })
  for (const pool of [asking, cancelling]) {
    pool.on('error', () => log('warn', 'vault connection lost'))
    pool.on('connect', (client) => client.on('error', () => undefined))
  }
  return {
    asking,
    cancel: async (pid) => {
      // The second try is for the connection that had died while it lay idle.
      const cancelled = async (): Promise<void> => void (await cancelling.query('select pg_catalog.pg_cancel_backend($1)', [pid]))
      await cancelled()
        .catch(cancelled)
        .catch(() => log('warn', 'vault query could not be cancelled'))
    },
    close: async () => void (await Promise.all([asking.end(), cancelling.end()])),
  }
}

/** Gives a connection back where `whole`, cuts it otherwise, whatever it is still doing. */
export function giveBack(client: PoolClient, whole: boolean): void {
  if (!whole) client.connection.stream.destroy()
  client.release(!whole)
}
