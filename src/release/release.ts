import { check } from '../base/check.ts'
import type { Fraction } from '../base/fraction.ts'
import type { Debit } from '../budget/debit.ts'
import type { BitSource } from '../noise/bits.ts'
import type { Mechanism } from '../noise/make-mechanism.ts'
import { draw } from '../noise/mechanism.ts'
import { coordinatesOf } from '../bound/reach.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import { type ExactRow, type ExactTable, openExact } from './exact.ts'

export type { ExactTable } from './exact.ts'
import { show } from './outputs.ts'
import type { Noisy, ShowOptions } from './shown.ts'

export type KeyTexts = readonly (string | null)[]

export interface ReleaseOrder {
  readonly plan: ReleasePlan
  /** One for each total of the plan. */
  readonly mechanisms: readonly Mechanism[]
  /** Every group, for a plan whose groups are listed; null otherwise. */
  readonly listed: readonly KeyTexts[] | null
  /** The least noisy number of persons a group is shown at, for a plan whose groups are selected; null otherwise. */
  readonly threshold: bigint | null
  readonly show: ShowOptions
}

/** A block answered: rows in the order of the block's SELECT list. Everything in it is released. */
export interface ReleasedTable {
  /** The ledger's id of the debit that paid for it. */
  readonly id: string
  readonly rows: readonly KeyTexts[]
  /** The widest margin of each output over the groups; null where none could be stated. */
  readonly margins: readonly (Fraction | null)[]
}

/**
 * The one door: takes the exact totals out against their debit, draws fresh noise for every group and total, and keeps nothing but the result. Groups that are
 * listed all appear; others appear when their noisy number of persons reaches the threshold. Rows are ordered by their keys alone. INVARIANT QUIET.
 */
export function release(table: ExactTable, debit: Debit, order: ReleaseOrder, bits: BitSource): ReleasedTable {
  const { debit: id, totals } = openExact(table, debit)
  const groups = groupsOf(order, totals)
  const margins: (Fraction | null)[] = order.plan.outputs.map(() => null)
  const rows: KeyTexts[] = []
  for (const group of groups) {
    const noisy = addNoise(order, group.values, bits)
    if (!isShown(order, noisy)) continue
    const outputs = order.plan.outputs.map((output) => show(order.plan, output, noisy, order.mechanisms, order.show))
    for (const [i, output] of outputs.entries()) {
      const widest = margins[i] ?? null
      if (output.margin !== null && (widest === null || widest.isLess(output.margin))) margins[i] = output.margin
    }
    rows.push(order.plan.columns.map((column) => (column.kind === 'key' ? (group.keys[column.index] ?? null) : (outputs[column.index]?.text ?? null))))
  }
  return { id, rows, margins }
}

function groupsOf(order: ReleaseOrder, totals: readonly ExactRow[]): readonly ExactRow[] {
  const empty = order.plan.totals.flatMap((total) => Array.from({ length: coordinatesOf(total) }, () => 0n))
  const exact = new Map(totals.map((row) => [keyText(row.keys), row]))
  check(exact.size === totals.length, 'the vault gives each group once')
  switch (order.plan.groups.kind) {
    case 'one':
      return [{ keys: [], values: totals[0]?.values ?? empty }]
    case 'listed': {
      check(order.listed !== null, 'listed groups come with their list')
      const once = new Map(order.listed.map((keys) => [keyText(keys), keys]))
      return sorted([...once.entries()].map(([text, keys]) => ({ keys, values: exact.get(text)?.values ?? empty })))
    }
    case 'selected':
      return sorted(totals)
  }
}

function keyText(keys: KeyTexts): string {
  return JSON.stringify(keys)
}

function sorted(rows: readonly ExactRow[]): readonly ExactRow[] {
  return [...rows].sort((a, b) => {
    const [x, y] = [keyText(a.keys), keyText(b.keys)]
    return x < y ? -1 : x > y ? 1 : 0
  })
}

function addNoise(order: ReleaseOrder, values: readonly bigint[], bits: BitSource): readonly Noisy[] {
  let next = 0
  const noisy = order.plan.totals.map((total, i): Noisy => {
    const mechanism = order.mechanisms[i]
    check(mechanism !== undefined, 'every total has its mechanism')
    const coordinates = coordinatesOf(total)
    return Array.from({ length: coordinates }, () => {
      const value = values[next]
      check(value !== undefined, 'the vault gives every total')
      next += 1
      return value + draw(mechanism, bits)
    })
  })
  check(next === values.length, 'the vault gives no more than the plan asked for')
  return noisy
}

function isShown(order: ReleaseOrder, noisy: readonly Noisy[]): boolean {
  if (order.plan.groups.kind !== 'selected') return true
  const persons = noisy[order.plan.groups.persons]?.[0]
  check(persons !== undefined && order.threshold !== null, 'selected groups have a person count and a threshold')
  return persons >= order.threshold
}
