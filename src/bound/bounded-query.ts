import { check } from '../base/check.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import { printQuery } from '../sql/print.ts'
import type { Query } from '../sql/tree.ts'
import { coordinatesOf } from './reach.ts'
import { boundedSql, type Draw } from './bounded-sql.ts'
import type { FixedValues } from './print-scalar.ts'

/**
 * A text the vault may run: made here only, from a plan, and never from an analyst's text. Nothing is bound to it: every constant stands in the text, quoted by
 * our own printer. ONE DOOR.
 */
export class BoundedQuery {
  readonly #text: string
  readonly #tree: Query
  readonly #keyCount: number
  readonly #totalCount: number
  private constructor(text: string, tree: Query, keyCount: number, totalCount: number) {
    this.#text = text
    this.#tree = tree
    this.#keyCount = keyCount
    this.#totalCount = totalCount
  }
  /** The bounded SQL of a plan. */
  static of(plan: ReleasePlan, fixed: FixedValues, draw: Draw): BoundedQuery {
    check(draw.keep !== null || plan.oneGroupByNature || plan.groups.kind === 'listed', 'groups are left unbounded only where there is nothing to choose')
    const tree = boundedSql(plan, fixed, draw)
    const columns = plan.totals.reduce((sum, total) => sum + coordinatesOf(total), 0)
    return new BoundedQuery(printQuery(tree), tree, plan.keys.length, columns)
  }
  get text(): string {
    return this.#text
  }
  get tree(): Query {
    return this.#tree
  }
  /** Leading columns that are keys; the rest are integer totals. */
  get keyCount(): number {
    return this.#keyCount
  }
  get totalCount(): number {
    return this.#totalCount
  }
}
