import { createHmac } from 'node:crypto'
import type { KeyObject } from 'node:crypto'

/** One charge as the chain covers it: every column but its own mac. Amounts and `seq` are decimal integer texts, macs are hex. */
export interface ChainRow {
  readonly seq: string
  readonly id: string
  /** ISO 8601 in UTC with microseconds. */
  readonly at: string
  readonly accounts: readonly string[]
  readonly periods: readonly string[]
  readonly epsilon: string | null
  readonly rho: string
  readonly delta: string
  readonly note: unknown
  readonly previousMac: string
}

/** What the first row follows. */
export const genesisMac = '00'.repeat(32)

/** HMAC-SHA-256 over the row and its predecessor's mac, hex. */
export function rowMac(key: KeyObject, row: ChainRow): string {
  const fields = [row.seq, row.id, row.at, row.accounts, row.periods, row.epsilon, row.rho, row.delta, canonicalJson(row.note), row.previousMac]
  return mac(key, ['charge', ...fields])
}

/** Holds the end of the chain: without the key nobody can make an earlier row the last one. */
export function headSeal(key: KeyObject, seq: string, lastMac: string): string {
  return mac(key, ['head', seq, lastMac])
}

/** Holds a stored answer to its charge. */
export function answerMac(key: KeyObject, id: string, answer: string): string {
  return mac(key, ['answer', id, answer])
}

/** JSON with the keys of every object in order, so that the text survives jsonb. */
export function canonicalJson(value: unknown): string {
  if (Array.isArray(value)) return `[${value.map(canonicalJson).join(',')}]`
  if (typeof value !== 'object' || value === null) return JSON.stringify(value)
  const entries = Object.entries(value).filter(([, item]) => item !== undefined)
  const inOrder = entries.toSorted(([a], [b]) => (a < b ? -1 : a > b ? 1 : 0))
  return `{${inOrder.map(([name, item]) => `${JSON.stringify(name)}:${canonicalJson(item)}`).join(',')}}`
}

function mac(key: KeyObject, fields: readonly unknown[]): string {
  return createHmac('sha256', key).update(JSON.stringify(fields)).digest('hex')
}
