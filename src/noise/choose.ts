import { BrokenCheck } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { Mechanism } from './make-mechanism.ts'

/** One person's reach in one total of a release, in integer units. */
export interface Reach {
  /** Groups a person may touch. */
  readonly groups: bigint
  /** What one person moves the total by in one group; for twins the joint bound on both. */
  readonly each: bigint
  /** 2: twin totals of which `each` bounds the sum of both moves. */
  readonly coordinates: 1 | 2
}

export type Wish = 'auto' | 'laplace' | 'gaussian'

/** What the release may spend: epsilon on the pure track, or rho on the other; rho 0 for an account without delta. */
export interface ReleaseBudget {
  readonly epsilon: Fraction
  readonly rho: Fraction
}

export interface Choice {
  readonly kind: Mechanism['kind']
  /** One for each total, in their order; each coordinate and group draws anew. */
  readonly mechanisms: readonly Mechanism[]
  /** What these mechanisms cost, rounded up; epsilon null for Gaussian noise. Delta is the caller's. */
  readonly charge: { readonly epsilon: Fraction | null; readonly rho: Fraction }
  /** Sum over totals of coordinates * variance / each², rounded up. */
  readonly relativeVariance: Fraction
  readonly runnerUp: { readonly kind: Mechanism['kind']; readonly relativeVariance: Fraction } | null
}

/** The mechanisms for one release's totals. */
export function choose(_reaches: readonly Reach[], _budget: ReleaseBudget, _wish: Wish): Choice {
  throw new BrokenCheck('choose')
}
