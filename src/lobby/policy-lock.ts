import { openSession, rowsOf, sqlstateOf } from './session.ts'
import { LobbyProblem } from './problem.ts'

/** 'hedgerow' read as eight bytes: one lock for every policy load over one ledger. */
const lockKey = '7522537965574647671'

/**
 * INVARIANT ONE LOAD: only one Hedgerow changes lobbies over this ledger at a time; the lock lives in the ledger's database, which no analyst may enter,
 * and ends with its connection.
 */
export async function underPolicyLock<T>(ledgerUrl: string, waitMs: number, work: () => Promise<T>): Promise<T> {
  const client = await openSession(ledgerUrl, { lock_timeout: String(waitMs), statement_timeout: '0' })
  try {
    try {
      await rowsOf(client, 'SELECT pg_catalog.pg_advisory_lock($1::bigint)', [lockKey])
    } catch (error) {
      if (sqlstateOf(error) !== '55P03') throw error
      throw new LobbyProblem('another Hedgerow is loading policies into this lobby', `try again when it has finished (waited ${waitMs} ms)`)
    }
    return await work()
  } finally {
    await client.end().catch(() => undefined)
  }
}
