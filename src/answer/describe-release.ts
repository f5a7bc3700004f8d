import { Fraction } from '../base/fraction.ts'
import { reachOf } from '../bound/reach.ts'
import { margin, varianceOf } from '../noise/mechanism.ts'
import type { Mechanism } from '../noise/make-mechanism.ts'
import type { Output, ReleasePlan, Total } from '../plan/release-plan.ts'
import { typedName } from '../plan/names.ts'
import { placesOf } from '../release/numbers.ts'
import type { Price } from './price.ts'

/** Names and figures of a release for people: for EXPLAIN, notices, views and the ledger's note. */

export function scaleText(mechanism: Mechanism): string {
  return mechanism.kind === 'laplace' ? mechanism.scale.toString() : mechanism.variance.toString()
}

/** A figure for reading: about six significant digits, rounded up. */
export function figure(value: Fraction): string {
  const size = value.isLess(value.neg()) ? value.neg() : value
  let places = 0
  for (let unit = 1n; places < 24 && size.isPositive() && size.n * unit < size.d * 1000n; unit *= 10n) places += 1
  const text = value.toDecimal(places, 'up')
  return text.includes('.') ? text.replace(/\.?0+$/, '') : text
}

/** A margin in the places of its step, rounded up. */
export function marginText(value: Fraction, total: Total): string {
  const places = total.kind === 'sum' || total.kind === 'twin' || total.kind === 'triple' ? Math.max(placesOf(total.units.step), 2) : 0
  const text = value.toDecimal(places, 'up')
  return text.includes('.') ? text.replace(/\.?0+$/, '') : text
}

export function tablesOf(plan: ReleasePlan): readonly string[] {
  const names = plan.scans.flatMap((scan) => (scan.table.kind === 'listed' ? [] : [typedName(plan.dataSet, scan.table)]))
  return [...new Set(names)]
}

/** Rows per group that count, where the total has such a cap. */
export function rowsOf(total: Total): string | null {
  return total.kind === 'persons' ? null : total.rows.toString()
}

/** The margin that is known before anything is asked; a mean's depends on its count. */
export function expectedMargin(output: Output, plan: ReleasePlan, price: Price, confidence: Fraction): string | null {
  const total = plan.totals[output.total]
  const mechanism = price.mechanisms[output.total]
  if (total === undefined || mechanism === undefined || total.kind === 'twin' || total.kind === 'triple') return null
  const units = margin(mechanism, confidence)
  return total.kind === 'sum' ? marginText(Fraction.make(units).mul(total.units.step), total) : units.toString()
}

/** What the ledger keeps of a release: enough to re-derive its charge, never a literal or an answer. */
export function ledgerNote(plan: ReleasePlan, price: Price, groups: bigint): Readonly<Record<string, unknown>> {
  return {
    tables: tablesOf(plan),
    groups: groups.toString(),
    keys: plan.groups.kind,
    threshold: price.threshold?.toString() ?? null,
    totals: plan.totals.map((total, i) => {
      const mechanism = price.mechanisms[i]
      return {
        of: total.kind,
        sensitivity: reachOf(total).toString(),
        rows: rowsOf(total),
        step: total.kind === 'sum' || total.kind === 'twin' || total.kind === 'triple' ? total.units.step.toString() : '1',
        mechanism: mechanism?.kind ?? null,
        scale: mechanism === undefined ? null : scaleText(mechanism),
        variance: mechanism === undefined ? null : figure(varianceOf(mechanism)),
      }
    }),
  }
}
