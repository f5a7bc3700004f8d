import { check } from '../base/check.ts'
import { refuse, withFacts } from '../base/refusal.ts'
import { scalarTypeOf } from '../catalog/scalar-type.ts'
import type { Expr, Query, Select } from '../sql/tree.ts'
import { asAggregate } from './aggregates.ts'
import type { Context } from './context.ts'
import { exampleFor } from './example.ts'
import { type FanOut, fanOut, listedRows } from './fan-out.ts'
import { groupsFor, lowerAggregate, totalsOf } from './totals.ts'
import { isOneGroupByNature, keyOf, listsOf } from './keys.ts'
import type { Limits } from './limits.ts'
import { lowerCondition, lowerExpr } from './lower-expr.ts'
import { lowerFromList } from './lower-from.ts'
import { withTables } from './lower-rows.ts'
import { own } from './owned.ts'
import type { Groups, ReleasePlan, Total } from './release-plan.ts'
import { conjuncts, isPrivate } from './relation.ts'

/**
 * Plans one block: a SELECT whose list holds group keys and aggregate calls only, grouped by the positions of the keys, as `cut.ts` prints it and as
 * anybody may hand it to hedgerow.pull. Pure: the same text, policy and settings give the same plan. INVARIANT STATIC.
 */
export function planBlock(query: Query, context: Context, limits: Limits): ReleasePlan {
  return withFacts(
    () => ({ example: exampleFor(context.dataSet, query), person: context.dataSet.personCalled }),
    () => plan(query, context, limits),
  )
}

function plan(query: Query, outer: Context, limits: Limits): ReleasePlan {
  const select = blockSelect(query)
  const context = withTables(query, outer, -1)
  const from = lowerFromList(select.from, context)
  if (!isPrivate(from.source)) refuse('block.shape', { what: 'a block without a private table' })
  const where = select.where === null ? [] : conjuncts(lowerCondition(select.where, from.scope, context))
  const owned = own(from.source, where, context)
  const spread = fanOut(owned)
  const grouped = keyPositions(select)
  const keys = grouped.map((position) => keyOf(lowerExpr(targetAt(select, position), from.scope, context), context.scans))
  const calls = select.targets.flatMap((target, position) => (grouped.includes(position) ? [] : [aggregateOf(target.value)]))
  const aggregates = calls.map((call) => lowerAggregate(call, from.scope, owned, context))
  const made = totalsOf(aggregates, owned, spread, limits.rows, context.scans)
  const { groups, totals } = groupsOf(keys, listsOf(keys, from.source, where, context.scans), made.totals)
  refuseOpaqueCaps(spread, context)
  const natural = keys.length === 0 || isOneGroupByNature(keys, spread, owned.source)
  return {
    dataSet: context.dataSet,
    scans: [...context.scans],
    owned,
    fanOut: spread,
    keys,
    groups,
    totals,
    outputs: made.outputs,
    columns: columnsOf(select, grouped),
    groupsPerPerson: natural ? 1n : groupsFor(owned, spread, limits.groups),
    oneGroupByNature: natural,
  } satisfies ReleasePlan
}

/** A capped scan is put in a total order over what is read of it, which such columns do not have. */
function refuseOpaqueCaps(spread: FanOut, context: Context): void {
  for (const scan of context.scans) {
    if (!spread.capped.has(scan.index)) continue
    for (const column of scan.table.columns.values())
      if (scalarTypeOf(column.type) === null) refuse('join.fan-out', { ceiling: listedRows.toString() }, scan.at)
  }
}

function groupsOf(
  keys: ReleasePlan['keys'],
  factors: ReturnType<typeof listsOf>,
  totals: readonly Total[],
): { readonly groups: Groups; readonly totals: readonly Total[] } {
  if (keys.length === 0) return { groups: { kind: 'one' }, totals }
  if (factors !== null) return { groups: { kind: 'listed', factors }, totals }
  const persons = totals.findIndex((total) => total.kind === 'persons' && total.filter === null)
  if (persons >= 0) return { groups: { kind: 'selected', persons }, totals }
  return { groups: { kind: 'selected', persons: totals.length }, totals: [...totals, { kind: 'persons', filter: null }] }
}

function blockSelect(query: Query): Select {
  const body = query.body
  if (body.kind !== 'select') return refuse('block.shape', { what: 'a set operation as one block' })
  const bare =
    query.order.length === 0 && query.limit === null && query.offset === null && body.having === null && body.windows.length === 0 && body.distinct === null
  return bare ? body : refuse('block.shape', { what: 'HAVING, ORDER BY, DISTINCT, WINDOW or LIMIT inside a block' })
}

/** Positions (from 0) of the targets that are group keys: a block groups by ordinals only. */
function keyPositions(select: Select): readonly number[] {
  const positions = select.group.map((item) => {
    const value = item.kind === 'expression' ? item.value : null
    const ordinal =
      value?.kind === 'constant' && value.constant.kind === 'integer'
        ? value.constant.value
        : refuse('block.shape', { what: 'a block that is not grouped by positions' })
    return select.targets.findIndex((_, i) => (i + 1).toString() === ordinal)
  })
  check(
    positions.every((position) => position >= 0),
    'group positions are in the list',
  )
  return [...new Set(positions)]
}

function targetAt(select: Select, position: number): Expr {
  const target = select.targets[position]
  check(target !== undefined, 'a key has its place in the list')
  return target.value
}

function aggregateOf(value: Expr): NonNullable<ReturnType<typeof asAggregate>> {
  const call = asAggregate(value)
  if (call !== null) return call
  return value.kind === 'column'
    ? refuse('block.ungrouped', { column: value.name.join('.') }, value.at)
    : refuse('block.shape', { what: 'a value that is neither a group key nor one aggregate, inside a block,' })
}

function columnsOf(select: Select, grouped: readonly number[]): ReleasePlan['columns'] {
  let output = 0
  return select.targets.map((_, position) => {
    const key = grouped.indexOf(position)
    if (key >= 0) return { kind: 'key', index: key }
    output += 1
    return { kind: 'output', index: output - 1 }
  })
}
