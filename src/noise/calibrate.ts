import { check } from '../base/check.ts'
import { sqrt } from '../base/exponential.ts'
import { Fraction } from '../base/fraction.ts'
import { bitLength, roundSignificant } from '../base/significant.ts'
import { laplaceRho, pureRho } from './laplace-law.ts'
import { makeGaussian, makeLaplace, type GaussianMechanism, type LaplaceMechanism } from './make-mechanism.ts'

/** Both parts of a parameter together are kept within this many bits, so that samplers and ledger handle short numbers. */
const shortBits = 128n
/** Longer ones are rounded up to so many significant bits: at most 1e-9 more noise. */
const convenientBits = 32n

/**
 * The Gaussian mechanism that costs rho at the most for a total of which one person moves the vector over all groups by l2Squared (square units) at the most:
 * the least convenient variance of at least l2Squared / (2 rho) (Bun & Steinke 2016; exact for the discrete law: Canonne, Kamath & Steinke 2020, theorem 4).
 */
export function gaussianFor(want: { readonly l2Squared: bigint; readonly rho: Fraction }): GaussianMechanism {
  check(want.l2Squared > 0n && want.rho.isPositive(), 'a Gaussian mechanism needs a sensitivity and a budget')
  return makeGaussian(convenient(Fraction.make(want.l2Squared).div(want.rho.add(want.rho))))
}

/**
 * The Laplace mechanism that costs epsilon at the most for a total of which one person moves the vector over all groups by l1 units at the most: the least
 * convenient scale of at least l1 / epsilon (Dwork, McSherry, Nissim & Smith 2006).
 */
export function laplaceFor(want: { readonly l1: bigint; readonly epsilon: Fraction }): LaplaceMechanism {
  check(want.l1 > 0n && want.epsilon.isPositive(), 'a Laplace mechanism needs a sensitivity and a budget')
  return makeLaplace(convenient(Fraction.make(want.l1).div(want.epsilon)))
}

/**
 * The Laplace mechanism that costs rho at the most for a person who moves up to `groups` coordinates by `each` units at the most, for an account whose pure
 * track is closed: the least scale, to one part in 2^20, whose cost is within rho.
 */
export function laplaceForRho(want: { readonly groups: bigint; readonly each: bigint; readonly rho: Fraction }): LaplaceMechanism {
  check(want.groups > 0n && want.each > 0n && want.rho.isPositive(), 'a Laplace mechanism needs a sensitivity and a budget')
  const share = want.rho.div(Fraction.make(want.groups))
  const fits = (scale: Fraction) => laplaceRho(scale, want.each).isAtMost(share)
  // One coordinate costs (each/scale)²/2 at the most.
  let high = roundSignificant(Fraction.make(want.each).mul(sqrt(Fraction.one.div(share.add(share)), 'up', convenientBits)), convenientBits, 'up')
  let low = high.mul(half)
  while (fits(low)) [low, high] = [low.mul(half), low]
  for (let i = 0; i < 20; i++) {
    const middle = low.add(high).mul(half)
    if (fits(middle)) high = middle
    else low = middle
  }
  return makeLaplace(high)
}

const half = Fraction.make(1n, 2n)

/** What a Gaussian mechanism costs for a person who moves the vector by l2Squared at the most: exact. */
export function rhoOfGaussian(mechanism: GaussianMechanism, l2Squared: bigint): Fraction {
  return Fraction.make(l2Squared).div(mechanism.variance.add(mechanism.variance))
}

/** What a Laplace mechanism costs on the pure track for a person who moves up to `groups` coordinates by `each` units at the most: exact. */
export function epsilonOfLaplace(mechanism: LaplaceMechanism, groups: bigint, each: bigint): Fraction {
  return Fraction.make(groups * each).div(mechanism.scale)
}

/** The same on the rho track: groups times the cost of one coordinate, rounded up, which is never above epsilon tanh(epsilon/2). */
export function rhoOfLaplace(mechanism: LaplaceMechanism, groups: bigint, each: bigint): Fraction {
  const coordinates = laplaceRho(mechanism.scale, each).mul(Fraction.make(groups))
  return coordinates.min(pureRho(epsilonOfLaplace(mechanism, groups, each)))
}

/** The value where it is short already, else the next one above that is. */
function convenient(value: Fraction): Fraction {
  return bitLength(value.n) + bitLength(value.d) <= shortBits ? value : roundSignificant(value, convenientBits, 'up')
}
