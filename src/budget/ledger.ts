import type { Fraction } from '../base/fraction.ts'

/**
 * What a release costs, on all three meters at once: pure epsilon (null: infinite, as for any Gaussian release), the zCDP parameter rho, and delta.
 * Valid together for one decomposition, as the acceptance rule needs (see accept.ts).
 */
export interface Charge {
  readonly epsilon: Fraction | null
  readonly rho: Fraction
  readonly delta: Fraction
}

/** A cap made ready for the rule: texts turned into exact fractions, the pot for key selections set aside, rho rounded down. */
export interface AccountCap {
  readonly epsilon: Fraction
  readonly delta: Fraction
  readonly deltaPot: Fraction
  readonly rhoCap: Fraction
  readonly renews: 'never' | 'month' | 'quarter' | 'year'
}

export interface Account {
  /** `<person key>/analyst/<name>` or `<person key>/everyone`: renaming a data set opens no second account. */
  readonly id: string
  readonly cap: AccountCap
}

export interface Balance {
  readonly account: string
  readonly cap: AccountCap
  /** The renewal period it stands in, as the ledger's clock says in UTC: 'always', '2026-12', '2026-Q4', '2026'. */
  readonly period: string
  /** Spent in this period; epsilon null once a release without a pure epsilon was debited. */
  readonly epsilonSpent: Fraction | null
  readonly rhoSpent: Fraction
  readonly deltaSpent: Fraction
  /** Spent over all periods. */
  readonly rhoEver: Fraction
  readonly deltaEver: Fraction
}

/** What the ledger keeps of a release beside its charge: enough to re-derive it; never a literal or an answer. */
export interface LedgerNote {
  readonly analyst: string
  readonly dataSet: string
  readonly policyHash: string
  readonly application: string
  /** sha256 of the block's plan, hex. */
  readonly fingerprint: string
  /** Mechanism, integer sensitivities, scales as exact fractions, bounds: plain JSON. */
  readonly release: Readonly<Record<string, unknown>>
}

/** One row of the ledger as its analyst may see it. */
export interface LedgerEntry {
  readonly id: string
  readonly at: string // ISO 8601, UTC: the instant of the debit
  readonly charge: Charge
  readonly note: LedgerNote
}

export type DebitOutcome =
  | { readonly kind: 'debited'; readonly id: string; readonly balances: readonly Balance[] }
  /** Nothing was written; `account` is the first that cannot bear it. */
  | { readonly kind: 'spent'; readonly account: string; readonly balances: readonly Balance[] }

/** The ledger as the pipeline sees it. Every method throws Failure('ledger') when the database cannot answer; a commit of unknown outcome counts as debited. */
export interface Ledger {
  /**
   * INVARIANT DEBITED: one transaction over all `accounts` (locked in the order of their ids), fsynced, or nothing.
   * `reserve` is what the same statement will still ask for: it must fit as well, but is not debited.
   */
  debit(accounts: readonly Account[], charge: Charge, reserve: Charge | null, note: LedgerNote): Promise<DebitOutcome>
  balances(accounts: readonly Account[]): Promise<readonly Balance[]>
  /** Keeps the finished release (JSON text) beside its row before it is handed over. */
  store(id: string, answer: string): Promise<void>
  /** Latest first. */
  charges(analyst: string, dataSet: string, limit: number): Promise<readonly LedgerEntry[]>
  close(): Promise<void>
}
