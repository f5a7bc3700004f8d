import { Pool } from 'pg'
import type { PoolClient } from 'pg'
import { BrokenCheck } from '../base/check.ts'
import { Failure } from '../base/failure.ts'
import type { Log } from '../base/ports.ts'

export type Row = readonly (string | null)[]

/** Runs one statement; its values go as text and come back as text. */
export interface Run {
  (text: string, values?: readonly unknown[]): Promise<{ readonly command: string; readonly rows: readonly Row[] }>
}

/** The ledger's pooled connections. */
export interface Connections {
  /** Runs `work` on one connection, which is cut after `limitMs` (15 s where not given); whatever goes wrong is logged by its SQLSTATE and becomes Failure('ledger'). */
  use<T>(during: string, work: (run: Run) => Promise<T>, limitMs?: number): Promise<T>
  /** The same with the database's own errors, for the start. */
  useAtStart<T>(work: (run: Run) => Promise<T>): Promise<T>
  close(): Promise<void>
}

const statementTimeoutMs = 5_000
const lockTimeoutMs = 4_000
const waitMs = 10_000
const useMs = 15_000

/** Thrown inside `use` when the connection was found dead before anything that lasts was sent: the work is begun once more on another one. */
export class NothingSent extends Error {
  override readonly name = 'NothingSent'
}

/** Turns a lost connection into NothingSent: for work that may be done twice. */
export async function orBeginAgain<T>(work: Promise<T>): Promise<T> {
  try {
    return await work
  } catch (error) {
    if (sqlstateOf(error) === '' || sqlstateOf(error).startsWith('57P')) throw new NothingSent('connection lost', { cause: error })
    throw error
  }
}

export function openConnections(url: string, maxConnections: number, log: Log): Connections {
  const pool = new Pool({
    connectionString: url,
    max: maxConnections,
    application_name: 'hedgerow ledger',
    options: '-c synchronous_commit=on -c search_path=pg_catalog,pg_temp -c timezone=UTC -c datestyle=ISO -c default_transaction_read_only=off',
    statement_timeout: statementTimeoutMs,
    lock_timeout: lockTimeoutMs,
    idle_in_transaction_session_timeout: waitMs,
    connectionTimeoutMillis: waitMs,
    keepAlive: true,
    pipeline: true,
  })
  pool.on('error', (error) => log('warn', 'ledger connection lost', { sqlstate: sqlstateOf(error) }))
  pool.on('connect', (client) => client.on('error', () => undefined))

  const borrow = async <T>(work: (run: Run) => Promise<T>, limitMs: number): Promise<T> => {
    const client = await pool.connect()
    const timer = setTimeout(() => client.connection.stream.destroy(), limitMs)
    let whole = false
    try {
      const result = await work(runOn(client))
      whole = client.getTransactionStatus() === 'I'
      return result
    } finally {
      clearTimeout(timer)
      if (!whole) client.connection.stream.destroy()
      client.release(!whole)
    }
  }

  return {
    useAtStart: (work) => borrow(work, useMs),
    use: async (during, work, limitMs = useMs) => {
      try {
        return await borrow(work, limitMs).catch(async (error: unknown) => {
          if (!(error instanceof NothingSent)) throw error
          return borrow(work, limitMs)
        })
      } catch (error) {
        if (error instanceof BrokenCheck || error instanceof Failure) throw error
        const failure = new Failure('ledger')
        log('error', 'ledger failed', { reference: failure.reference, during, sqlstate: sqlstateOf(error) })
        throw failure
      }
    },
    close: () => pool.end(),
  }
}

/** The five characters of a server's error, '' for anything else (a lost connection, a time-out of ours). */
export function sqlstateOf(error: unknown): string {
  const code: unknown = typeof error === 'object' && error !== null && 'code' in error ? error.code : ''
  return typeof code === 'string' && /^[0-9A-Z]{5}$/.test(code) ? code : ''
}

function runOn(client: PoolClient): Run {
  return async (text, values = []) => {
    const { command, rows } = await client.query<(string | null)[]>({ text, values: [...values], rowMode: 'array', types: { getTypeParser: () => asText } })
    return { command, rows }
  }
}

function asText(value: string): string {
  return value
}
