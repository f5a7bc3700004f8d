import { Fraction } from '../base/fraction.ts'
import type { Cap } from '../policy/data-set.ts'
import { rhoCap } from './convert.ts'
import type { AccountCap } from './ledger.ts'

/**
 * Makes a policy's cap ready for the acceptance rule: half of delta is set aside for key selections where some listed column has no declared domain, and rho is
 * what the rest of delta converts to, rounded down (0 for a pure account). A RangeError where a text is no decimal number or out of range.
 */
export function accountCap(cap: Cap, hasUndeclaredKeys: boolean): AccountCap {
  const epsilon = Fraction.parse(cap.epsilon)
  const delta = Fraction.parse(cap.delta)
  if (!epsilon.isPositive()) throw new RangeError('epsilon is not greater than 0')
  if (delta.n < 0n || !delta.isLess(largestDelta)) throw new RangeError('delta is not at least 0 and below 0.5')
  const deltaPot = hasUndeclaredKeys ? delta.mul(Fraction.make(1n, 2n)) : Fraction.zero
  return { epsilon, delta, deltaPot, rhoCap: rhoCap(epsilon, delta.sub(deltaPot)), renews: cap.renews }
}

/** From here on a cap promises nothing: the answer may give a person away every other time. */
const largestDelta = Fraction.make(1n, 2n)
