import { check } from '../base/check.ts'
import { Fraction } from '../base/fraction.ts'
import type { Reach } from '../base/reach.ts'
import { roundSignificant } from '../base/significant.ts'
import { epsilonOfLaplace, gaussianFor, laplaceFor, laplaceForRho, rhoOfGaussian, rhoOfLaplace } from './calibrate.ts'
import type { Mechanism } from './make-mechanism.ts'
import { varianceOf } from './mechanism.ts'

export type Wish = 'auto' | 'laplace' | 'gaussian'

/** What the release may spend: epsilon on the pure track, or rho on the other. */
export interface ReleaseBudget {
  /** Null where the account's pure track is closed: Laplace noise then costs rho as well. */
  readonly epsilon: Fraction | null
  /** 0 for an account without delta. */
  readonly rho: Fraction
}

/** What chosen mechanisms cost, rounded up; epsilon null for Gaussian noise. With the delta of a key selection it makes a Charge. */
export interface NoiseCharge {
  readonly epsilon: Fraction | null
  readonly rho: Fraction
}

export interface Candidate {
  readonly kind: Mechanism['kind']
  /** One for each total, in their order; every coordinate of every group draws anew. */
  readonly mechanisms: readonly Mechanism[]
  readonly charge: NoiseCharge
  /** The sum over totals of coordinates * variance / each², rounded up. */
  readonly relativeVariance: Fraction
}

export interface Choice extends Candidate {
  /** The other law at the same budget, null where the budget has none. */
  readonly runnerUp: Candidate | null
}

/**
 * The mechanisms for one release's totals. The budget is split equally over the totals, which is best for equal relative accuracy under either law (minimise
 * the sum of variance / each² by Lagrange), and 'auto' takes the law with the least such sum. INVARIANT CALIBRATED. Null where the account
 * can pay for no such law: Gaussian without rho, or any with the pure track closed and no rho.
 */
export function choose(reaches: readonly Reach[], budget: ReleaseBudget, wish: Wish): Choice | null {
  check(reaches.length > 0 && budget.epsilon?.isPositive() !== false && budget.rho.n >= 0n, 'a release has totals and a budget')
  if (budget.epsilon === null && !budget.rho.isPositive()) return null
  const totals = reaches.map((reach) => ({ ...reach, each: reach.each === 0n ? 1n : reach.each }))
  const laplace = laplaceCandidate(totals, budget)
  const gaussian = budget.rho.isPositive() ? gaussianCandidate(totals, budget.rho) : null
  if (gaussian === null) return wish === 'gaussian' ? null : { ...laplace, runnerUp: null }
  const takesGaussian = wish === 'gaussian' || (wish === 'auto' && gaussian.relativeVariance.isLess(laplace.relativeVariance))
  return takesGaussian ? { ...gaussian, runnerUp: laplace } : { ...laplace, runnerUp: gaussian }
}

function laplaceCandidate(totals: readonly Reach[], budget: ReleaseBudget): Candidate {
  const share = (budget.epsilon ?? budget.rho).div(Fraction.make(BigInt(totals.length)))
  const mechanisms = totals.map(({ groups, each }) =>
    budget.epsilon === null ? laplaceForRho({ groups, each, rho: share }) : laplaceFor({ l1: groups * each, epsilon: share }),
  )
  const costs = mechanisms.map((mechanism, i) => {
    const { groups, each } = at(totals, i)
    return { epsilon: epsilonOfLaplace(mechanism, groups, each), rho: rhoOfLaplace(mechanism, groups, each) }
  })
  const charge = { epsilon: sum(costs.map((each) => each.epsilon)), rho: short(sum(costs.map((each) => each.rho))) }
  return { kind: 'laplace', mechanisms, charge, relativeVariance: relativeVariance(totals, mechanisms) }
}

function gaussianCandidate(totals: readonly Reach[], rho: Fraction): Candidate {
  const share = rho.div(Fraction.make(BigInt(totals.length)))
  const mechanisms = totals.map(({ groups, each }) => gaussianFor({ l2Squared: groups * each * each, rho: share }))
  const costs = mechanisms.map((mechanism, i) => {
    const { groups, each } = at(totals, i)
    return rhoOfGaussian(mechanism, groups * each * each)
  })
  return { kind: 'gaussian', mechanisms, charge: { epsilon: null, rho: sum(costs) }, relativeVariance: relativeVariance(totals, mechanisms) }
}

function relativeVariance(totals: readonly Reach[], mechanisms: readonly Mechanism[]): Fraction {
  const terms = mechanisms.map((mechanism, i) => {
    const { each, coordinates } = at(totals, i)
    return varianceOf(mechanism).mul(Fraction.make(BigInt(coordinates), each * each))
  })
  return short(sum(terms))
}

function sum(terms: readonly Fraction[]): Fraction {
  return terms.reduce((a, b) => a.add(b), Fraction.zero)
}

function short(value: Fraction): Fraction {
  return roundSignificant(value, 64n, 'up')
}

function at(totals: readonly Reach[], i: number): Reach {
  const total = totals[i]
  check(total !== undefined, 'every mechanism has its total')
  return total
}
