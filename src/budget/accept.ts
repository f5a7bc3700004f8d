import { Fraction } from '../base/fraction.ts'
import type { AccountCap, Charge } from './ledger.ts'

/** What an account has borne so far; epsilon null once a release without a pure epsilon was debited. */
export interface Spent {
  readonly epsilon: Fraction | null
  readonly rho: Fraction
  readonly delta: Fraction
}

/**
 * Whether the account can bear the charge: the key selections stay within their pot, and at least one of the two tracks stays within its cap.
 *
 * Why this keeps the whole interaction (epsilon, delta)-private however the analyst picks each release from the answers before it. Leave the selections that
 * leak aside: their chances add up to deltaPot at most. Every other course of the interaction ends with one of the tracks kept. Where the pure track is kept,
 * the likelihood ratio L of the two neighbouring worlds is at most e^epsilon, so nothing exceeds it. Where the rho track is kept, take any order a > 1: each
 * factor of L^a has a conditional mean of at most exp(a(a-1)rho), with a rho that was fixed before the release, so L^a divided by the exponential of what was
 * spent is a nonnegative supermartingale (Feldman & Zrnic 2021, "Individual Privacy Accounting via a Rényi Filter"), and its mean stays below 1 at whatever
 * instant the analyst stops. Hence E[L^a] over those courses is at most exp(a(a-1)rhoCap), and the conversion of Canonne, Kamath & Steinke 2020 turns that
 * into a chance of at most delta - deltaPot of exceeding e^epsilon. The three parts add up to delta. deltaPot is fixed beforehand: the argument
 * needs it.
 */
export function accepts(cap: AccountCap, spent: Spent, charge: Charge): boolean {
  const after = addCharge(spent, charge)
  if (!after.delta.isAtMost(cap.deltaPot)) return false
  return (after.epsilon !== null && after.epsilon.isAtMost(cap.epsilon)) || after.rho.isAtMost(cap.rhoCap)
}

/** The meters after one more charge. */
export function addCharge(spent: Spent, charge: Charge): Spent {
  return {
    epsilon: spent.epsilon === null || charge.epsilon === null ? null : spent.epsilon.add(charge.epsilon),
    rho: spent.rho.add(charge.rho),
    delta: spent.delta.add(charge.delta),
  }
}

/** An account nothing was spent from. */
export const nothingSpent: Spent = { epsilon: Fraction.zero, rho: Fraction.zero, delta: Fraction.zero }
