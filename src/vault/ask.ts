import { check } from '../base/check.ts'
import { Failure } from '../base/failure.ts'
import type { Log } from '../base/ports.ts'
import { BoundedQuery } from '../bound/bounded-query.ts'
import type { ExactTable } from '../release/exact.ts'
import type { CatalogClient } from './catalog.ts'
import { openVaultConnections } from './connections.ts'
import { runQuery } from './run.ts'
import { runSession } from './session.ts'
import { readStanding } from './standing.ts'

export interface VaultOptions {
  readonly url: string
  /** The longest any statement runs, whatever the deadline says. */
  readonly statementTimeoutMs: number
  readonly maxConnections: number
  readonly log: Log
  /** PostgreSQL's work_mem for a query, in kB; 16 MB where not given. */
  readonly workMemKb?: number
  /** One row more than this is a failure; a million where not given. */
  readonly rowCeiling?: number
  /** More bytes than this of one answer are a failure, whether they make a row yet or not; 256 MB where not given. */
  readonly byteCeiling?: number
}

export interface AskOptions {
  readonly timeZone: string
  /** From the call on, the wait for a connection included. */
  readonly deadlineMs: number
  readonly signal: AbortSignal
}

export interface Vault {
  readonly serverVersion: number
  /** What is wrong with the role Hedgerow was given, one sentence each. */
  readonly warnings: readonly string[]
  /**
   * Runs one query, which nothing but a plan can make, in a read-only snapshot of its own. Rejects with Failure('vault'), Failure('deadline'), Failure('internal') for an answer of another shape, or the
   * signal's reason, at that instant; the query is then stopped in the vault and its connection cut. Nothing that the vault says in an error is kept.
   */
  ask(query: BoundedQuery, options: AskOptions): Promise<ExactTable>
  /** A read-only snapshot for the reader of the catalogue. Errors of the server become Failure('vault'); what `work` throws itself passes through. */
  session<T>(work: (client: CatalogClient) => Promise<T>): Promise<T>
  close(): Promise<void>
}

/** Connects and looks at the role; a VaultUnfit where the vault cannot be used. */
export async function connectVault(settings: VaultOptions): Promise<Vault> {
  const { url, statementTimeoutMs, maxConnections, log, workMemKb = 16_384, rowCeiling = 1_000_000, byteCeiling = 256 * 1024 * 1024 } = settings
  const connections = openVaultConnections({ url, maxConnections, waitMs: Math.max(statementTimeoutMs, 10_000), log })
  const standing = await readStanding(connections.asking).catch(async (error: unknown) => {
    await connections.close()
    throw error
  })
  for (const warning of standing.warnings) log('warn', 'vault role has more rights than it needs', { warning })
  // A warm connection, so that the first cancel need not log in.
  await connections.cancel('0')
  return {
    serverVersion: standing.serverVersion,
    warnings: standing.warnings,
    ask: async (query, { timeZone, deadlineMs, signal }) => {
      check(query instanceof BoundedQuery, 'the vault runs bounded queries only')
      signal.throwIfAborted()
      const timeoutMs = Math.max(1, Math.min(statementTimeoutMs, deadlineMs))
      const run = runQuery(connections, query, { timeZone, timeoutMs, workMemKb, rowCeiling, byteCeiling, noticesLostClients: standing.noticesLostClients })
      const stop = stopAt(timeoutMs, signal)
      try {
        return await Promise.race([run.result, stop.stopped])
      } catch (error) {
        run.cut()
        if (signal.aborted && error === signal.reason) throw error
        const failure = error instanceof Failure ? error : new Failure('vault')
        log('error', 'vault query failed', { reference: failure.reference })
        throw failure
      } finally {
        stop.forget()
      }
    },
    session: (work) => runSession(connections, statementTimeoutMs, log, work),
    close: () => connections.close(),
  }
}

/** Rejects at the deadline, or with the signal's reason when it aborts. */
function stopAt(deadlineMs: number, signal: AbortSignal): { readonly stopped: Promise<never>; forget(): void } {
  let forget = (): void => undefined
  const stopped = new Promise<never>((_, reject) => {
    const timer = setTimeout(() => reject(new Failure('deadline')), deadlineMs)
    const abort = (): void => reject(signal.reason)
    signal.addEventListener('abort', abort, { once: true })
    forget = () => {
      clearTimeout(timer)
      signal.removeEventListener('abort', abort)
    }
  })
  return { stopped, forget: () => forget() }
}
