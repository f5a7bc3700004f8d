import { scalarsOf } from '../bound/print-source.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import { weightOf } from '../plan/weight.ts'

const ladder: readonly number[] = [100, 300, 1000, 3000, 10_000, 30_000]
/** Work on each row from which a plan is in the next class, and the next but one: the classes triple, and so do these. */
const heavier: readonly number[] = [60, 180, 540]

/**
 * The instants, in milliseconds after the debit, at which a reply may leave: the plan's own class first, then each longer one, the deadline last. They
 * follow from policy and plan alone. INVARIANT QUIET.
 */
export function timeClasses(plan: ReleasePlan, deadlineMs: number): readonly number[] {
  const scans = plan.scans.length
  const weight = weightOf(scalarsOf(plan))
  const raises =
    (scans > 2 ? 1 : 0) + (plan.fanOut.capped.size > 0 ? 1 : 0) + (plan.fanOut.counted.length > 0 ? 1 : 0) + heavier.filter((work) => weight > work).length
  const base = plan.dataSet.replyAfterMs
  const above = ladder.filter((ms) => ms > base && ms < deadlineMs)
  const classes = [base, ...above].slice(raises).filter((ms) => ms < deadlineMs)
  return [...(classes.length > 0 ? classes : above.slice(-1)), deadlineMs]
}
