import { check } from '../base/check.ts'
import type { Account, Balance, LedgerEntry, LedgerNote } from '../budget/ledger.ts'
import type { Row, Run } from './connections.ts'
import { balanceOf, chargeOf, text } from './rows.ts'

/** Where each account stands now, in the order asked for; an account that was never debited stands at nothing. */
export async function readBalances(run: Run, accounts: readonly Account[]): Promise<readonly Balance[]> {
  const { rows } = await run(
    `select s.period, s.epsilon, s.rho, s.delta, s.rho_ever, s.delta_ever
       from unnest($1::text[], $2::text[]) with ordinality as asked (id, renews, place) cross join lateral ledger.standing(asked.id, asked.renews) s
      order by asked.place`,
    [accounts.map(({ id }) => id), accounts.map(({ cap }) => cap.renews)],
  )
  return accounts.map((account, place) => balanceOf(account, rows[place] ?? []))
}

/** The analyst's charges, latest first. */
export async function readCharges(run: Run, analyst: string, dataSet: string, limit: number): Promise<readonly LedgerEntry[]> {
  check(Number.isSafeInteger(limit) && limit >= 0, 'a limit is a count')
  const { rows } = await run(
    `select id, to_char(at at time zone 'UTC', 'YYYY-MM-DD"T"HH24:MI:SS.MS"Z"'), epsilon, rho, delta, note
       from ledger.charges where note ->> 'analyst' = $1 and note ->> 'dataSet' = $2 order by seq desc limit $3`,
    [analyst, dataSet, limit],
  )
  return rows.map(entryOf)
}

function entryOf([id, at, epsilon, rho, delta, note]: Row): LedgerEntry {
  return {
    id: text(id),
    at: text(at),
    charge: chargeOf({ epsilon: epsilon ?? null, rho: text(rho), delta: text(delta) }),
    note: JSON.parse(text(note)) as LedgerNote,
  }
}
