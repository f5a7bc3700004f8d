import pg from 'pg'
import { Fraction } from '../../src/base/fraction.ts'
import type { Log } from '../../src/base/ports.ts'
import type { Account, AccountCap, Charge, LedgerNote } from '../../src/budget/ledger.ts'
import { openLedger } from '../../src/ledger/open.ts'
import type { OpenLedger } from '../../src/ledger/open.ts'

export const macKey = new Uint8Array(32).fill(7)

export const note: LedgerNote = {
  analyst: 'ana',
  dataSet: 'ferries',
  policyHash: 'aa'.repeat(32),
  application: 'psql',
  fingerprint: 'bb'.repeat(32),
  release: { mechanism: 'discrete-gaussian', sigmaSquared: '25/4', sensitivities: ['20', '1'], bounds: { groups: 12, rows: 20 } },
}

export interface Event {
  readonly level: string
  readonly event: string
  readonly fields: Readonly<Record<string, unknown>> | undefined
}

export function recorder(): { readonly log: Log; readonly events: Event[] } {
  const events: Event[] = []
  return { events, log: (level, event, fields) => void events.push({ level, event, fields }) }
}

export async function open(url: string, maxConnections = 8, log: Log = () => undefined): Promise<OpenLedger> {
  return openLedger({ url, macKey, log, allowUnsafe: true, maxConnections })
}

export function cap(epsilon: string, rhoCap: string, deltaPot = '0', renews: AccountCap['renews'] = 'never'): AccountCap {
  return { epsilon: Fraction.parse(epsilon), delta: Fraction.parse('1e-6'), deltaPot: Fraction.parse(deltaPot), rhoCap: Fraction.parse(rhoCap), renews }
}

export function account(id: string, limits: AccountCap): Account {
  return { id, cap: limits }
}

export function charge(epsilon: string | null, rho: string, delta = '0'): Charge {
  return { epsilon: epsilon === null ? null : Fraction.parse(epsilon), rho: Fraction.parse(rho), delta: Fraction.parse(delta) }
}

/** Runs SQL as the superuser, beside the ledger. */
export async function sql(url: string, text: string, values: readonly unknown[] = []): Promise<Record<string, unknown>[]> {
  const client = new pg.Client({ connectionString: url })
  await client.connect()
  try {
    return (await client.query<Record<string, unknown>>(text, [...values])).rows
  } finally {
    await client.end()
  }
}
