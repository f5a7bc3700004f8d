import { refuse } from '../base/refusal.ts'
import { accountCap } from '../budget/cap.ts'
import type { Account } from '../budget/ledger.ts'
import type { DataSet, Policies } from '../policy/data-set.ts'

export interface Accounts {
  readonly analyst: Account
  readonly everyone: Account
}

/** The accounts a release of this analyst is debited to: the analyst's own, and the one over all analysts of these people. */
export function accountsOf(policies: Policies, dataSet: DataSet, user: string): Accounts {
  const own = policies.analysts.get(user)?.data.get(dataSet.name)
  const all = policies.everyone.get(dataSet.name)
  if (own === undefined || all === undefined) return refuse('account.closed', { user, dataset: dataSet.name })
  return {
    analyst: { id: `${dataSet.personKey}/analyst/${user}`, cap: accountCap(own, dataSet.hasUndeclaredKeys) },
    everyone: { id: `${dataSet.personKey}/everyone`, cap: accountCap(all, dataSet.hasUndeclaredKeys) },
  }
}

/** An account's name for people: 'your' or 'everyone’s'. */
export function accountCalled(id: string): string {
  return id.endsWith('/everyone') ? "everyone's" : 'your'
}
