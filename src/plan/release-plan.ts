import type { Fraction } from '../base/fraction.ts'
import type { Scalar } from '../catalog/scalar.ts'
import type { ScalarType } from '../catalog/scalar-type.ts'
import type { DataSet } from '../policy/data-set.ts'
import type { FanOut } from './fan-out.ts'
import type { Owned } from './owned.ts'
import type { Scan, Source } from './relation.ts'

/** A number put on an integer grid: round(value / step), from `low` to `high`. */
export interface Units {
  readonly value: Scalar
  readonly step: Fraction
  readonly low: bigint
  readonly high: bigint
}

/** What is added up over persons; every total is an integer. `rows` caps the rows of a person in one group that count. */
export type Total =
  | { readonly kind: 'rows'; readonly of: Scalar | null; readonly filter: Scalar | null; readonly rows: bigint }
  | { readonly kind: 'persons'; readonly filter: Scalar | null }
  | { readonly kind: 'sum'; readonly units: Units; readonly filter: Scalar | null; readonly rows: bigint }
  /** Two one-sided sums, of value - low and of high - value: from them count, sum and mean at once. */
  | { readonly kind: 'twin'; readonly units: Units; readonly filter: Scalar | null; readonly rows: bigint }
  /**
   * Three sums, of (high - value)², 2 (value - low)(high - value) and (value - low)²: they are never negative and add up to width² a row, and from them come
   * count, mean and variance.
   */
  | { readonly kind: 'triple'; readonly units: Units; readonly filter: Scalar | null; readonly rows: bigint }

/** The variance of the rows, or its square root, with n or n - 1 below it. */
export type Spread = 'var_pop' | 'var_samp' | 'stddev_pop' | 'stddev_samp'

/** A column of the released table that is made of totals. */
export type Output =
  | { readonly kind: 'count'; readonly total: number }
  | { readonly kind: 'sum'; readonly total: number }
  | { readonly kind: 'mean'; readonly total: number }
  | { readonly kind: 'spread'; readonly total: number; readonly of: Spread }

export interface Key {
  /** In canonical form: equal values print alike. */
  readonly scalar: Scalar
  /** As it is grouped by and printed. */
  readonly type: ScalarType
}

/** Where the values of some keys are listed from; all lists together, crossed, are the groups. */
export type ListFactor =
  | { readonly kind: 'texts'; readonly key: number; readonly type: ScalarType; readonly texts: readonly (string | null)[] }
  | { readonly kind: 'column'; readonly key: number; readonly table: string; readonly column: string; readonly nullable: boolean }
  /** Every `step` between two fixed instants or whole numbers, brought to the key's form by `unit`. */
  | {
      readonly kind: 'instants'
      readonly key: number
      readonly type: ScalarType
      readonly low: Scalar
      readonly high: Scalar
      readonly unit: string
      readonly nullable: boolean
    }
  | { readonly kind: 'numbers'; readonly key: number; readonly type: ScalarType; readonly low: Scalar; readonly high: Scalar; readonly nullable: boolean }
  /** The published part of the FROM itself. */
  | { readonly kind: 'component'; readonly keys: readonly number[]; readonly source: Source; readonly tests: readonly Scalar[]; readonly padded: boolean }

export type Groups =
  /** No GROUP BY: one group. */
  | { readonly kind: 'one' }
  /** INVARIANT QUIET: every listed group is answered, whether anybody is in it or not. */
  | { readonly kind: 'listed'; readonly factors: readonly ListFactor[] }
  /** Groups are shown when their noisy number of persons passes a threshold; `persons` is that total. */
  | { readonly kind: 'selected'; readonly persons: number }

/** One block, planned: everything that decides what is asked of the vault and what it costs, apart from the account. */
export interface ReleasePlan {
  readonly dataSet: DataSet
  readonly scans: readonly Scan[]
  readonly owned: Owned
  readonly fanOut: FanOut
  readonly keys: readonly Key[]
  readonly groups: Groups
  readonly totals: readonly Total[]
  readonly outputs: readonly Output[]
  /** The order of keys and outputs in the block's SELECT list. */
  readonly columns: readonly ({ readonly kind: 'key'; readonly index: number } | { readonly kind: 'output'; readonly index: number })[]
  /** Groups a person may touch, before the number of listed groups is known. */
  readonly groupsPerPerson: bigint
  /** Whether no person can be in more than one group by nature, so that nothing has to be chosen. */
  readonly oneGroupByNature: boolean
}
