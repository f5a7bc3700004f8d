import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import { cast, selectQuery, target } from '../catalog/build.ts'
import { endsOf } from '../catalog/functions/times.ts'
import { isFixed, type Range, type Scalar } from '../catalog/scalar.ts'
import { listedIn, scalarsOf } from './print-source.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import type { Query } from '../sql/tree.ts'
import { fixedKey, type FixedValues, noFixedValues, printScalar } from './print-scalar.ts'

/**
 * Column-free expressions of a plan, largest first, and what proves its dates and times: both are computed in the lobby before anything is debited, so that
 * an error in them is the statement's own and no row can cause it.
 */
export function fixedExpressions(plan: ReleasePlan): readonly Scalar[] {
  const found = new Map<string, Scalar>()
  const add = (scalar: Scalar): void => {
    if (scalar.node.kind === 'apply') found.set(fixedKey(scalar), scalar)
  }
  const visit = (scalar: Scalar): void => {
    if (isFixed(scalar)) return add(scalar)
    if (scalar.node.kind === 'apply') for (const arg of scalar.node.args) visit(arg)
  }
  for (const scalar of scalarsOf(plan)) {
    visit(scalar)
    for (const end of endsOf(scalar)) add(end)
  }
  for (const scan of plan.scans) for (const scalar of listedIn(scan)) visit(scalar)
  if (plan.groups.kind === 'listed')
    for (const factor of plan.groups.factors) if (factor.kind === 'instants' || factor.kind === 'numbers') for (const end of [factor.low, factor.high]) add(end)
  return [...found.values()]
}

function holds(range: Range | null, text: string | null): boolean {
  if (range === null || text === null) return true
  try {
    const value = Fraction.parse(text)
    return range.low.isAtMost(value) && value.isAtMost(range.high)
  } catch {
    return false // NaN and the infinities
  }
}

/** One row of texts, a column an expression. */
export function fixedSql(expressions: readonly Scalar[]): Query {
  return selectQuery({ targets: expressions.map((scalar, i) => target(cast(printScalar(scalar, noFixedValues), 'text'), `v${i.toString()}`)), from: [] })
}

/** The computed values by what names them. Refused where one lies outside of what the plan holds it to be, as the year of infinity does. */
export function fixedValues(expressions: readonly Scalar[], row: readonly (string | null)[]): FixedValues {
  for (const [i, scalar] of expressions.entries())
    if (!holds(scalar.range, row[i] ?? null)) refuse('expr.unbounded', { expression: 'a value of the statement’s own' }, scalar.at)
  return new Map(expressions.map((scalar, i) => [fixedKey(scalar), row[i] ?? null]))
}
