/** One person's reach in one total of a release, in integer units. */
export interface Reach {
  /** Groups a person may touch, at least 1. */
  readonly groups: bigint
  /** What one person moves the total by in one group; where a person moves several coordinates, the bound on the sum of the moves. A total that nobody can move (0) is treated as 1. */
  readonly each: bigint
  /** 2: twin totals, 3: triples; each coordinate draws from the same mechanism. */
  readonly coordinates: 1 | 2 | 3
}
