import { check } from '../base/check.ts'
import { capAmount, fromAmount, spentAmount } from '../budget/amount.ts'
import type { Account, Balance, Charge } from '../budget/ledger.ts'
import type { Row } from './connections.ts'

/** A charge in the ledger's units, decimal integer texts, rounded up. */
export interface Amounts {
  readonly epsilon: string | null
  readonly rho: string
  readonly delta: string
}

/** What nothing costs. */
export const nothing: Amounts = { epsilon: '0', rho: '0', delta: '0' }

export function amountsOf(charge: Charge): Amounts {
  return {
    epsilon: charge.epsilon === null ? null : spentAmount('epsilon', charge.epsilon),
    rho: spentAmount('rho', charge.rho),
    delta: spentAmount('delta', charge.delta),
  }
}

export function chargeOf(amounts: Amounts): Charge {
  return {
    epsilon: amounts.epsilon === null ? null : fromAmount('epsilon', amounts.epsilon),
    rho: fromAmount('rho', amounts.rho),
    delta: fromAmount('delta', amounts.delta),
  }
}

/** Caps as arrays, one element an account, rounded down. */
export function capsOf(accounts: readonly Account[]): readonly (readonly string[])[] {
  return [
    accounts.map(({ id }) => id),
    accounts.map(({ cap }) => cap.renews),
    accounts.map(({ cap }) => capAmount('epsilon', cap.epsilon)),
    accounts.map(({ cap }) => capAmount('rho', cap.rhoCap)),
    accounts.map(({ cap }) => capAmount('delta', cap.deltaPot)),
  ]
}

/** Columns: period, epsilon, rho, delta, rho_ever, delta_ever. */
export function balanceOf(account: Account, columns: Row): Balance {
  const [period, epsilon, rho, delta, rhoEver, deltaEver] = columns
  return {
    account: account.id,
    cap: account.cap,
    period: text(period),
    epsilonSpent: epsilon === null ? null : fromAmount('epsilon', text(epsilon)),
    rhoSpent: fromAmount('rho', text(rho)),
    deltaSpent: fromAmount('delta', text(delta)),
    rhoEver: fromAmount('rho', text(rhoEver)),
    deltaEver: fromAmount('delta', text(deltaEver)),
  }
}

/** A column that is never null. */
export function text(value: string | null | undefined): string {
  check(typeof value === 'string', 'a column of the ledger is not null')
  return value
}
