import { randomUUID } from 'node:crypto'
import type { KeyObject } from 'node:crypto'
import { check } from '../base/check.ts'
import type { Account, Charge, DebitOutcome, LedgerNote } from '../budget/ledger.ts'
import { canonicalJson, headSeal, rowMac } from './chain.ts'
import { orBeginAgain } from './connections.ts'
import type { Connections, Row, Run } from './connections.ts'
import { readBalances } from './read.ts'
import { amountsOf, balanceOf, capsOf, nothing, text } from './rows.ts'

export interface DebitRequest {
  readonly accounts: readonly Account[]
  readonly charge: Charge
  readonly reserve: Charge | null
  readonly note: LedgerNote
}

/**
 * INVARIANT DEBITED: one transaction in two flights. The first locks and updates the accounts in the order of their ids and then the chain's head; the second appends
 * the row under a mac the database cannot make, and commits. Whatever fails before the server's word that it committed is Failure('ledger'), and no answer is given.
 */
export async function debit(connections: Connections, key: KeyObject, request: DebitRequest): Promise<DebitOutcome> {
  const { accounts } = request
  check(accounts.length > 0 && new Set(accounts.map(({ id }) => id)).size === accounts.length, 'a debit names each of its accounts once')
  return connections.use('debit', async (run) => {
    const rows = await lock(run, request)
    const byAccount = new Map(rows.map((row) => [row[0], row]))
    const spent = accounts.find(({ id }) => byAccount.get(id)?.[1] !== 't')
    if (spent !== undefined) {
      await run('rollback')
      return { kind: 'spent', account: spent.id, balances: await readBalances(run, accounts) }
    }
    const balances = accounts.map((account) => balanceOf(account, byAccount.get(account.id)?.slice(2) ?? []))
    const head = rows.find((row) => row[0] === null) ?? []
    const id = await append(
      run,
      key,
      request,
      head,
      balances.map(({ period }) => period),
    )
    return { kind: 'debited', id, balances }
  })
}

async function lock(run: Run, { accounts, charge, reserve }: DebitRequest): Promise<readonly Row[]> {
  const due = amountsOf(charge)
  const later = reserve === null ? nothing : amountsOf(reserve)
  const values = [...capsOf(accounts), due.epsilon, due.rho, due.delta, later.epsilon, later.rho, later.delta]
  const debited =
    'select account, fits, period, epsilon, rho, delta, rho_ever, delta_ever, head_seq, head_mac, head_seal, at from ledger.debit($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11)'
  // No commit was sent: a connection that had died while it lay idle costs nothing.
  const [, { rows }] = await orBeginAgain(Promise.all([run('begin isolation level read committed read write'), run(debited, values)]))
  return rows
}

async function append(run: Run, key: KeyObject, { accounts, charge, note }: DebitRequest, head: Row, periods: readonly string[]): Promise<string> {
  const [headSeq, previousMac, seal, at] = head.slice(8).map(text)
  check(headSeq !== undefined && previousMac !== undefined && at !== undefined, 'the chain has a head')
  // An end of the chain that this key did not seal was put there by someone else: nothing may be built on it.
  if (seal !== headSeal(key, headSeq, previousMac)) throw new Error('the seal of the head is broken')
  const due = amountsOf(charge)
  const seq = (BigInt(headSeq) + 1n).toString()
  const row = { seq, id: randomUUID(), at, accounts: accounts.map(({ id }) => id), periods, ...due, note, previousMac }
  const mac = rowMac(key, row)
  const values = [
    seq,
    row.id,
    at,
    row.accounts,
    periods,
    due.epsilon,
    due.rho,
    due.delta,
    canonicalJson(note),
    bytes(previousMac),
    bytes(mac),
    bytes(headSeal(key, seq, mac)),
  ]
  const [, { command }] = await Promise.all([run('select ledger.append($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12)', values), run('commit')])
  if (command !== 'COMMIT') throw new Error('the debit was rolled back')
  return row.id
}

function bytes(hex: string): string {
  return `\\x${hex}`
}
