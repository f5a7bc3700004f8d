import { Fraction } from '../base/fraction.ts'
import type { Balance, Charge } from '../budget/ledger.ts'
import { printExpr } from '../sql/print.ts'
import { spentOf, timesLeft } from '../budget/left.ts'
import { rowsOf, marginText, scaleText, figure } from './describe-release.ts'
import { type Given, leftText } from './give.ts'
import type { LastOutput } from './last-answers.ts'
import type { PlannedBlock } from './plan-text.ts'
import type { Prepared } from './prepare.ts'
import type { Price } from './price.ts'
import type { SessionSettings } from './session-settings.ts'

export function chargeText(charge: Charge): string {
  const main = charge.epsilon === null ? `rho ${figure(charge.rho)}` : `epsilon ${figure(charge.epsilon)}`
  return charge.delta.isZero() ? main : `${main} and delta ${figure(charge.delta)}`
}

/** A percentage in words of the confidence. */
export function percent(confidence: Fraction): string {
  const text = confidence.mul(Fraction.make(100n)).toDecimal(4, 'down')
  return `${text.replace(/\.?0+$/, '')} %`
}

/** One NOTICE after a release: what was spent, what is left, the margins. The views say the same. */
export function noticeOf(block: PlannedBlock, given: Given, settings: SessionSettings, price: Price): string {
  const own = given.balances.find((balance) => !balance.account.endsWith('/everyone'))
  const margins = block.plan.columns.flatMap((column, i) => {
    if (column.kind !== 'output') return []
    const text = marginOf(block, given, column.index)
    return text === null ? [] : [`${nameOf(block, i)} ± ${text}`]
  })
  const left = own === undefined ? '' : `; ${leftText(own)}${more(own, given.charge)}`
  const noise = margins.length === 0 ? '' : `; ${percent(settings.confidence)} margin of the noise: ${margins.join(', ')}`
  return `spent ${chargeText(given.charge)} (${price.kind} noise)${left}${noise}`
}

function more(balance: Balance, charge: Charge): string {
  if (!charge.rho.isPositive()) return ''
  const spent = spentOf(balance)
  const times = timesLeft(balance.cap, spent, charge)
  return ` (${times.toString()} more like it)`
}

function marginOf(block: PlannedBlock, given: Given, output: number): string | null {
  const widest = given.table.margins[output] ?? null
  const total = block.plan.totals[block.plan.outputs[output]?.total ?? -1]
  return widest === null || total === undefined ? null : marginText(widest, total)
}

/** An output as the analyst knows it: the aggregate call. */
function nameOf(block: PlannedBlock, column: number): string {
  const call = block.calls[column]
  return call === undefined ? (block.labels[column] ?? '') : printExpr(call)
}

/** What hedgerow.last_answer shows of a release. */
export function outputsOf(block: PlannedBlock, price: Price, prepared: Prepared, settings: SessionSettings, given: Given): readonly LastOutput[] {
  return block.plan.columns.flatMap((column, i): readonly LastOutput[] => {
    if (column.kind !== 'output') return []
    const output = block.plan.outputs[column.index]
    const total = output === undefined ? undefined : block.plan.totals[output.total]
    const mechanism = output === undefined ? undefined : price.mechanisms[output.total]
    if (total === undefined || mechanism === undefined) return []
    return [
      {
        output: nameOf(block, i),
        mechanism: mechanism.kind,
        scale: scaleText(mechanism),
        margin: marginOf(block, given, column.index),
        confidence: settings.confidence.toDecimal(6, 'down').replace(/\.?0+$/, ''),
        groups: prepared.groups.toString(),
        rows: rowsOf(total),
        charge: given.charge,
        at: new Date(given.at).toISOString(),
        id: given.table.id,
      },
    ]
  })
}
