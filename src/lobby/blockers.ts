import type pg from 'pg'
import { literal } from './quote.ts'
import { rowsOf } from './session.ts'

const lookEveryMs = 200

/**
 * Runs `work` on `client` while `watcher`, a second connection, ends every analyst's session (and rolls back every prepared transaction of one) that
 * `client` waits for. So no analyst's open transaction or lock holds a policy load up.
 */
export async function endingBlockers<T>(
  watcher: pg.Client,
  client: pg.Client,
  analysts: readonly string[],
  ended: (role: string) => void,
  work: () => Promise<T>,
): Promise<T> {
  const [row] = await rowsOf(client, 'SELECT pg_catalog.pg_backend_pid()')
  const pid = row?.[0] ?? '0'
  const stop = new AbortController()
  const watching = watch(watcher, pid, analysts, ended, stop.signal)
  try {
    return await work()
  } finally {
    stop.abort()
    await watching
  }
}

async function watch(watcher: pg.Client, pid: string, analysts: readonly string[], ended: (role: string) => void, signal: AbortSignal): Promise<void> {
  while (!signal.aborted) {
    await pause(lookEveryMs, signal)
    if (signal.aborted) return
    // A look that fails is no reason to fail the load: lock_timeout ends it if the lock stays.
    await look(watcher, pid, analysts, ended).catch(() => undefined)
  }
}

async function look(watcher: pg.Client, pid: string, analysts: readonly string[], ended: (role: string) => void): Promise<void> {
  const gone = await rowsOf(
    watcher,
    `SELECT a.usename, pg_catalog.pg_terminate_backend(a.pid)
       FROM pg_catalog.unnest(pg_catalog.pg_blocking_pids($1::int)) AS b(pid) JOIN pg_catalog.pg_stat_activity a USING (pid)
      WHERE a.usename = ANY ($2::text[])`,
    [pid, analysts],
  )
  for (const [role] of gone) ended(role ?? '')
  const prepared = await rowsOf(
    watcher,
    `SELECT gid, owner FROM pg_catalog.pg_prepared_xacts
      WHERE 0 = ANY (pg_catalog.pg_blocking_pids($1::int)) AND owner = ANY ($2::text[]) AND database = pg_catalog.current_database()`,
    [pid, analysts],
  )
  for (const [gid, owner] of prepared) {
    await watcher.query(`ROLLBACK PREPARED ${literal(gid ?? '')}`)
    ended(owner ?? '')
  }
}

function pause(ms: number, signal: AbortSignal): Promise<void> {
  return new Promise((resolve) => {
    const timer = setTimeout(done, ms)
    signal.addEventListener('abort', done, { once: true })
    function done(): void {
      clearTimeout(timer)
      signal.removeEventListener('abort', done)
      resolve()
    }
  })
}
