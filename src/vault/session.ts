import { Failure } from '../base/failure.ts'
import type { Log } from '../base/ports.ts'
import type { CatalogClient } from './catalog.ts'
import { asText, giveBack } from './connections.ts'
import type { VaultConnections } from './connections.ts'

/** Runs `work` in one read-only snapshot, for the catalogue: no row of a person is asked for here. */
export async function runSession<T>(connections: VaultConnections, timeoutMs: number, log: Log, work: (client: CatalogClient) => Promise<T>): Promise<T> {
  const opaque = async <R>(reply: Promise<R>): Promise<R> => {
    try {
      return await reply
    } catch {
      const failure = new Failure('vault')
      log('error', 'vault catalogue query failed', { reference: failure.reference })
      throw failure
    }
  }
  const client = await opaque(connections.asking.connect())
  let whole = false
  try {
    await opaque(client.query('begin isolation level repeatable read read only'))
    await opaque(client.query(`select set_config('statement_timeout', $1, true)`, [`${timeoutMs}ms`]))
    const result = await work({
      query: async ({ text, values = [] }) => opaque(client.query<unknown[]>({ text, values, rowMode: 'array', types: asText })),
    })
    await opaque(client.query('commit'))
    whole = true
    return result
  } finally {
    giveBack(client, whole)
  }
}
