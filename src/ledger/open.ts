import { createSecretKey } from 'node:crypto'
import { Failure } from '../base/failure.ts'
import type { Log } from '../base/ports.ts'
import type { Ledger } from '../budget/ledger.ts'
import { answerMac } from './chain.ts'
import { openConnections, orBeginAgain } from './connections.ts'
import { debit } from './debit.ts'
import { holdDurable, LedgerUnfit, migrate } from './migrate.ts'
import { readBalances, readCharges } from './read.ts'
import { text } from './rows.ts'
import { verifyChain } from './verify.ts'
import type { Verdict } from './verify.ts'

const verifyMs = 3_600_000
const storeSql = 'insert into ledger.answers (id, answer, mac) values ($1, $2, $3) on conflict (id) do nothing'
const storedSql = `select answer, encode(mac, 'hex') from ledger.answers where id = $1`

export interface LedgerOptions {
  readonly url: string
  /** At least 32 bytes, kept outside the database. */
  readonly macKey: Uint8Array
  readonly log: Log
  /** Lets a server run that could forget a debit in a crash (fsync off): for tests and the demo, with a warning. */
  readonly allowUnsafe?: boolean
  readonly maxConnections?: number
}

/** The ledger with what only its own edge needs. */
export interface OpenLedger extends Ledger {
  /** The answer kept beside a charge, null where none was; Failure('ledger') for one that was changed by hand. */
  stored(id: string): Promise<string | null>
  verify(): Promise<Verdict>
}

/** Opens the ledger, making or updating its schema; a LedgerUnfit tells the operator why it cannot be used. */
export async function openLedger({ url, macKey, log, allowUnsafe = false, maxConnections = 8 }: LedgerOptions): Promise<OpenLedger> {
  if (macKey.length < 32) throw new LedgerUnfit(`the key of the ledger has ${macKey.length} bytes: give one of at least 32 random bytes`)
  const key = createSecretKey(macKey)
  const connections = openConnections(url, maxConnections, log)
  try {
    await connections.useAtStart(async (run) => {
      await holdDurable(run, allowUnsafe, log)
      await migrate(run, key)
    })
  } catch (error) {
    await connections.close()
    if (error instanceof LedgerUnfit) throw error
    throw new LedgerUnfit(`the ledger cannot be opened: ${error instanceof Error ? error.message || error.name : 'unknown error'}`, { cause: error })
  }
  return {
    debit: (accounts, charge, reserve, note) => debit(connections, key, { accounts, charge, reserve, note }),
    balances: (accounts) => connections.use('balances', (run) => orBeginAgain(readBalances(run, accounts))),
    charges: (analyst, dataSet, limit) => connections.use('charges', (run) => orBeginAgain(readCharges(run, analyst, dataSet, limit))),
    store: async (id, answer) => {
      const values = [id, answer, `\\x${answerMac(key, id, answer)}`]
      await connections.use('store', (run) => orBeginAgain(run(storeSql, values)))
    },
    stored: async (id) => {
      const { rows } = await connections.use('stored', (run) => orBeginAgain(run(storedSql, [id])))
      const [answer, mac] = rows[0] ?? []
      if (answer === undefined) return null
      if (mac === answerMac(key, id, text(answer))) return text(answer)
      const failure = new Failure('ledger')
      log('error', 'stored answer was changed by hand', { reference: failure.reference })
      throw failure
    },
    verify: () => connections.use('verify', (run) => verifyChain(run, key), verifyMs),
    close: () => connections.close(),
  }
}
