/** One person's reach in one total of a release, in integer units. */
export interface Reach {
  /** Groups a person may touch, at least 1. */
  readonly groups: bigint
  /** What one person moves the total by in one group; for twins the bound on the sum of both moves. A total that nobody can move (0) is treated as 1. */
  readonly each: bigint
  /** 2: twin totals, which draw from the same mechanism each. */
  readonly coordinates: 1 | 2
}
