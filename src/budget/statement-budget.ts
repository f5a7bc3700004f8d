import { check } from '../base/check.ts'
import { tanh } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { roundSignificant } from '../base/significant.ts'
import { capAmount, fromAmount } from './amount.ts'
import type { AccountCap } from './ledger.ts'

/** What a statement may spend: epsilon on the pure track, or rho on the other, and delta where it selects keys. */
export interface StatementBudget {
  readonly epsilon: Fraction
  readonly rho: Fraction
  readonly delta: Fraction
}

/**
 * What a statement's epsilon buys: at most the same share of either track, so that as many statements fit whichever law they take, and no more rho than an
 * epsilon-private mechanism could cost (epsilon tanh(epsilon/2); Bun & Steinke 2016). Rounded down. `delta` is the statement's own where
 * it selects keys, else 0. rho is 0 on a pure account.
 */
export function statementBudget(epsilon: Fraction, cap: AccountCap, delta = Fraction.zero): StatementBudget {
  check(epsilon.isPositive() && delta.n >= 0n, 'a statement has a positive epsilon and a delta')
  const asPure = epsilon.mul(tanh(epsilon.mul(Fraction.make(1n, 2n)), 'down', 96n))
  const share = cap.rhoCap.mul(epsilon).div(cap.epsilon)
  return { epsilon, rho: wholeUnits(roundSignificant(asPure.min(share), 64n, 'down')), delta }
}

/** Cut to whole units of the ledger where it is a unit or more, so that the shares of a cap fit into it to the last one. */
function wholeUnits(rho: Fraction): Fraction {
  const whole = fromAmount('rho', capAmount('rho', rho))
  return whole.isZero() ? rho : whole
}
