import { check } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { Spent } from './accept.ts'
import { capAmount, spentAmount, type Meter } from './amount.ts'
import { epsilonOf } from './convert.ts'
import type { AccountCap, Balance, Charge } from './ledger.ts'

/** What a balance has borne in its period, as the acceptance rule reads it. */
export function spentOf(balance: Balance): Spent {
  return { epsilon: balance.epsilonSpent, rho: balance.rhoSpent, delta: balance.deltaSpent }
}

/**
 * How many more times the account can bear the charge, by the acceptance rule in the ledger's units: as often as the pot allows, on the track that lasts
 * longer. The charge costs some rho.
 */
export function timesLeft(cap: AccountCap, spent: Spent, charge: Charge): bigint {
  check(charge.rho.isPositive(), 'a charge costs something')
  const onRho = timesWithin('rho', cap.rhoCap, spent.rho, charge.rho)
  const closed = spent.epsilon === null || charge.epsilon === null || charge.epsilon.isZero()
  const onEpsilon = closed ? 0n : timesWithin('epsilon', cap.epsilon, spent.epsilon, charge.epsilon)
  const onTracks = onRho > onEpsilon ? onRho : onEpsilon
  if (charge.delta.isZero()) return spent.delta.isAtMost(cap.deltaPot) ? onTracks : 0n
  const onPot = timesWithin('delta', cap.deltaPot, spent.delta, charge.delta)
  return onPot < onTracks ? onPot : onTracks
}

function timesWithin(meter: Meter, cap: Fraction, spent: Fraction, each: Fraction): bigint {
  const left = BigInt(capAmount(meter, cap)) - BigInt(spentAmount(meter, spent))
  return left < 0n ? 0n : left / BigInt(spentAmount(meter, each))
}

/**
 * The epsilon that the spending amounts to at the cap's delta, rounded up; for display: the guarantee is the cap. The lesser of the two tracks' readings;
 * null where neither is open (a pure account after Gaussian noise, which the rule never lets happen).
 */
export function epsilonSpent(cap: AccountCap, spent: Spent): Fraction | null {
  const delta = cap.delta.sub(cap.deltaPot)
  const onRho = delta.isPositive() ? epsilonOf(spent.rho, delta) : null
  if (onRho === null || spent.epsilon === null) return onRho ?? spent.epsilon
  return onRho.min(spent.epsilon)
}

/**
 * Whether a Gaussian release now would leave fewer of these default statements than a Laplace release: an account's first Gaussian release closes its pure
 * track for good. `auto` noise keeps to Laplace then.
 */
export function gaussianCostsStatements(cap: AccountCap, spent: Spent, gaussian: Charge, laplace: Charge): boolean {
  if (spent.epsilon === null) return false
  const afterGaussian = { epsilon: null, rho: spent.rho.add(gaussian.rho), delta: spent.delta.add(gaussian.delta) }
  return timesLeft(cap, afterGaussian, gaussian) + 1n < timesLeft(cap, spent, laplace)
}
