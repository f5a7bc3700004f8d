import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { Spent } from './accept.ts'
import type { AccountCap, Charge } from './ledger.ts'

/** How many more times the account can bear the charge; display only. */
export function timesLeft(_cap: AccountCap, _spent: Spent, _charge: Charge): bigint {
  throw new BrokenCheck('timesLeft')
}

/** The epsilon that the spending amounts to at the cap's delta, rounded up; display only. */
export function epsilonSpent(_cap: AccountCap, _spent: Spent): Fraction {
  throw new BrokenCheck('epsilonSpent')
}
