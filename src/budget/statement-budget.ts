import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { AccountCap } from './ledger.ts'

/** What a statement may spend: epsilon on the pure track, or rho on the other. */
export interface StatementBudget {
  readonly epsilon: Fraction
  readonly rho: Fraction
}

/** What a statement's epsilon buys on either track of an account. */
export function statementBudget(_epsilon: Fraction, _cap: AccountCap): StatementBudget {
  throw new BrokenCheck('statementBudget')
}
