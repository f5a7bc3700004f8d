import type { Reach } from '../base/reach.ts'
import type { ReleasePlan, Total } from '../plan/release-plan.ts'

function size(value: bigint): bigint {
  return value < 0n ? -value : value
}

/** What one person moves a total by in one group, in its integer units; for twins the sum of both moves. */
export function reachOf(total: Total): bigint {
  switch (total.kind) {
    case 'rows':
      return total.rows
    case 'persons':
      return 1n
    case 'sum': {
      const [low, high] = [size(total.units.low), size(total.units.high)]
      return total.rows * (low > high ? low : high)
    }
    case 'twin':
      return total.rows * (total.units.high - total.units.low)
    case 'triple':
      return total.rows * (total.units.high - total.units.low) ** 2n
  }
}

/** How many integers a total is, in one group. */
export function coordinatesOf(total: Total): 1 | 2 | 3 {
  return total.kind === 'triple' ? 3 : total.kind === 'twin' ? 2 : 1
}

/** Groups one person can touch once the number of listed groups is known. */
export function groupsTouched(plan: ReleasePlan, listed: bigint | null): bigint {
  return listed !== null && listed < plan.groupsPerPerson ? listed : plan.groupsPerPerson
}

/** The sensitivity of every total, in order. by INVARIANT BOUNDED: `bounded-sql.ts` prints the bound these numbers speak of. */
export function reachesOf(plan: ReleasePlan, groups: bigint): readonly Reach[] {
  return plan.totals.map((total) => ({ groups, each: reachOf(total), coordinates: coordinatesOf(total) }))
}

/** How many groups a person's are cut down to; null where there is nothing to choose: one group by nature, or no more listed groups than a person may touch. */
export function groupsToKeep(plan: ReleasePlan, listed: number | null): bigint | null {
  if (plan.oneGroupByNature) return null
  return listed !== null && BigInt(listed) <= plan.groupsPerPerson ? null : plan.groupsPerPerson
}
