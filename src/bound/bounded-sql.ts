import {
  call,
  cast,
  column,
  extreme,
  integer,
  isNull,
  logic,
  numeric,
  operator,
  positions,
  selectQuery,
  subquery,
  target,
  text,
  when,
} from '../catalog/build.ts'
import { paddedScans } from '../plan/relation.ts'
import type { ReleasePlan, Total, Units } from '../plan/release-plan.ts'
import type { Expr, FromItem, Query, Target } from '../sql/tree.ts'
import { pickOrder } from './pick-order.ts'
import { type FixedValues, printKey, printScalar, scanName } from './print-scalar.ts'
import { allOf, plainFrame, printSource, readColumns } from './print-source.ts'

const keyName = (i: number): string => `k${i.toString()}`
const countName = (i: number): string => `n${i.toString()}`
const sumName = (i: number): string => `t${i.toString()}`
const squareName = (i: number): string => `u${i.toString()}`

/** How the bound is drawn: the number of groups a person may keep (null: nothing to choose), and the fresh secret salts of the choice. */
export interface Draw {
  readonly keep: bigint | null
  readonly salts: readonly bigint[]
}

/**
 * INVARIANT BOUNDED. The SQL that the vault runs: the owned relation; added up for each person and group; bounded there (rows by scaling, so that no row is
 * sampled; groups by a salted order that depends on that person's rows alone); then added up over persons. The bound is the last step before the total.
 * Columns: the keys as text, then one or two integers a total.
 */
export function boundedSql(plan: ReleasePlan, fixed: FixedValues, draw: Draw): Query {
  const partials = plan.fanOut.single ? singleRows(plan, fixed) : partialSums(plan, fixed)
  const bounded = boundPartials(plan, partials, draw)
  const keys = plan.keys.map((_, i) => target(cast(column('q', keyName(i)), 'text'), keyName(i)))
  return selectQuery({
    targets: [...keys, ...plan.totals.flatMap(addUp)],
    from: [subquery(bounded, 'q')],
    where: draw.keep === null ? null : operator(column('q', 'pick'), '<=', integer(draw.keep)),
    group: plan.keys.map((_, i) => ({ kind: 'expression', value: column('q', keyName(i)) })),
  })
}

interface Relation {
  readonly from: FromItem
  readonly where: Expr
  readonly person: Expr
  readonly keys: readonly Target[]
}

function relation(plan: ReleasePlan, fixed: FixedValues): Relation {
  const everywhere = plan.owned.source.kind === 'filter' ? plan.owned.source.tests : []
  const printed = printSource(plan.owned.source, {
    fixed,
    read: readColumns(plan),
    capped: plan.fanOut.capped,
    counted: plan.fanOut.counted,
    everywhere,
    padded: paddedScans(plan.owned.source),
  })
  const person = column(scanName(plan.owned.person.scan), plan.owned.person.column)
  const tests = [...printed.tests.map((test) => printScalar(test, fixed)), ...listedOnly(plan, fixed), isNull(person, true)]
  return {
    from: printed.from,
    where: allOf(tests) ?? isNull(person, true),
    person,
    keys: plan.keys.map((key, i) => target(printKey(key.scalar, fixed), keyName(i))),
  }
}

/** Rows of values outside a declared list reach no group: they must not use up a person's groups either. */
function listedOnly(plan: ReleasePlan, fixed: FixedValues): readonly Expr[] {
  if (plan.groups.kind !== 'listed') return []
  return plan.groups.factors.flatMap((factor) => {
    const key = factor.kind === 'texts' ? plan.keys[factor.key] : undefined
    if (factor.kind !== 'texts' || key?.scalar.node.kind !== 'column' || key.type.family === 'bool') return []
    const value = printScalar(key.scalar, fixed)
    const list = factor.texts.filter((text) => text !== null).map((text) => printScalar({ ...key.scalar, node: { kind: 'constant', text } }, fixed))
    const listed: Expr = { kind: 'in-list', arg: value, list, negated: false, at: -1 }
    return [factor.texts.includes(null) ? logic('or', [listed, isNull(value)]) : listed]
  })
}

/** A value on its grid, as an integer expression. */
function unitsExpr(total: Extract<Total, { kind: 'sum' | 'twin' | 'triple' }>, fixed: FixedValues): Expr {
  const { value, step } = total.units
  const printed = printScalar(value, fixed)
  const whole = value.type.family === 'integer' && value.carrier !== 'numeric' && step.n === 1n && step.d === 1n
  if (whole) return value.carrier === 'own' && value.type.name !== 'int8' ? printed : cast(printed, 'int8')
  const exact = value.carrier === 'numeric' || value.type.family === 'numeric' ? printed : cast(printed, 'numeric')
  // multiplied rather than divided where that is exact: division rounds
  const scaled =
    step.n === 1n
      ? operator(exact, '*', numeric(step.d.toString()))
      : operator(operator(exact, '*', numeric(step.d.toString())), '/', numeric(step.n.toString()))
  return cast(call('round', [scaled]), 'int8')
}

function sameRow(total: Total, fixed: FixedValues): { readonly test: Expr | null; readonly units: Expr | null } {
  const filter = total.filter === null ? null : printScalar(total.filter, fixed)
  if (total.kind === 'persons') return { test: filter, units: null }
  if (total.kind === 'rows') {
    const present = total.of === null ? null : isNull(printScalar(total.of, fixed), true)
    return { test: allOf([filter, present].filter((each) => each !== null)), units: null }
  }
  return { test: filter, units: unitsExpr(total, fixed) }
}

/** One row a person: nothing to add up first. */
function singleRows(plan: ReleasePlan, fixed: FixedValues): Query {
  const rows = relation(plan, fixed)
  const columns = plan.totals.flatMap((total, i): readonly Target[] => {
    const { test, units } = sameRow(total, fixed)
    if (units === null) return test === null ? [target(integer(1n), countName(i))] : [target(when(test, integer(1n), integer(0n)), countName(i))]
    const present = allOf([test, isNull(units, true)].filter((each) => each !== null)) ?? test
    return present === null
      ? []
      : [
          target(when(present, integer(1n), integer(0n)), countName(i)),
          target(test === null ? units : when(test, units, null), sumName(i)),
          ...squares(total, i, (value) => (test === null ? value : when(test, value, null)), units),
        ]
  })
  return selectQuery({ targets: [target(rows.person, 'p'), ...rows.keys, ...columns], from: [rows.from], where: rows.where })
}

/** What each person has in each group. */
function partialSums(plan: ReleasePlan, fixed: FixedValues): Query {
  const rows = relation(plan, fixed)
  const columns = plan.totals.flatMap((total, i): readonly Target[] => {
    const { test, units } = sameRow(total, fixed)
    if (units === null) return total.kind === 'persons' && total.filter === null ? [] : [target(call('count', [], { star: true, filter: test }), countName(i))]
    return [
      target(call('count', [units], { filter: test }), countName(i)),
      target(call('sum', [units], { filter: test }), sumName(i)),
      ...squares(total, i, (value) => call('sum', [value], { filter: test }), units),
    ]
  })
  return selectQuery({
    targets: [target(rows.person, 'p'), ...rows.keys, ...columns],
    from: [rows.from],
    where: rows.where,
    group: positions(plan.keys.length + 1),
  })
}

/** For a triple, the squares above the clamp's low end as well: width² fits 62 bits, as the plan proves. */
function squares(total: Total, i: number, shape: (value: Expr) => Expr, units: Expr): readonly Target[] {
  if (total.kind !== 'triple') return []
  const above = operator(cast(units, 'int8'), '-', cast(text(total.units.low.toString()), 'int8'))
  return [target(shape(operator(above, '*', above)), squareName(i))]
}

/** Each person's part of each total, capped; and, where groups have to be chosen, the group's place in the salted order. */
function boundPartials(plan: ReleasePlan, partials: Query, draw: Draw): Query {
  const keys = plan.keys.map((_, i) => target(column('p1', keyName(i)), keyName(i)))
  const parts = plan.totals.flatMap((total, i) => capped(total, i, plan.fanOut.single))
  const pick = draw.keep === null ? [] : [target(pickRank(plan, draw), 'pick')]
  return selectQuery({ targets: [...keys, ...parts, ...pick], from: [subquery(partials, 'p1')] })
}

function capped(total: Total, i: number, single: boolean): readonly Target[] {
  const n = column('p1', countName(i))
  const s = orZero(column('p1', sumName(i)))
  switch (total.kind) {
    case 'persons':
      return total.filter === null ? [] : [target(when(operator(n, '>', integer(0n)), integer(1n), integer(0n)), countName(i))]
    case 'rows':
      return [target(single ? n : extreme('least', n, integer(total.rows)), countName(i))]
    case 'sum':
      return [target(single ? s : scaled(s, n, total.rows), sumName(i))]
    case 'twin': {
      // in numeric: a person's rows are not yet capped here
      const above = operator(cast(s, 'numeric'), '-', operator(cast(n, 'numeric'), '*', numeric(total.units.low.toString())))
      return [target(single ? n : extreme('least', n, integer(total.rows)), countName(i)), target(single ? above : scaled(above, n, total.rows), sumName(i))]
    }
    case 'triple': {
      const [first, second] = triple(column('p1', squareName(i)), n, s, total.units)
      const part = (value: Expr): Expr => (single ? value : scaled(value, n, total.rows))
      return [target(single ? n : extreme('least', n, integer(total.rows)), countName(i)), target(part(first), sumName(i)), target(part(second), squareName(i))]
    }
  }
}

/** The sums of (high - value)² and of 2 (value - low)(high - value) of a person's rows; the third is what width² a row leaves over. */
function triple(squared: Expr, n: Expr, sum: Expr, units: Units): readonly [Expr, Expr] {
  const width = numeric((units.high - units.low).toString())
  const count = cast(n, 'numeric')
  const above = operator(cast(sum, 'numeric'), '-', operator(count, '*', numeric(units.low.toString())))
  const square = cast(orZero(squared), 'numeric')
  const twice = operator(operator(numeric('2'), '*', width), '*', above)
  const first = operator(operator(operator(operator(count, '*', width), '*', width), '-', twice), '+', square)
  return [first, operator(twice, '-', operator(numeric('2'), '*', square))]
}

function orZero(value: Expr): Expr {
  return { kind: 'coalesce', args: [value, integer(0n)], at: -1 }
}

/** The sum as it is where at most `rows` rows made it; else brought down to the mean of its rows times `rows`, towards zero. */
function scaled(sum: Expr, count: Expr, rows: bigint): Expr {
  const down = call('div', [operator(cast(sum, 'numeric'), '*', numeric(rows.toString())), cast(count, 'numeric')])
  return when(operator(count, '<=', integer(rows)), cast(sum, 'numeric'), down)
}

function pickRank(plan: ReleasePlan, draw: Draw): Expr {
  return call('row_number', [], {
    over: {
      name: '',
      refers: '',
      partition: [column('p1', 'p')],
      order: pickOrder(plan, draw.salts, (i) => column('p1', keyName(i)), column('p1', 'p')),
      frame: plainFrame,
    },
  })
}

function addUp(total: Total, i: number): readonly Target[] {
  const [n, s] = [column('q', countName(i)), column('q', sumName(i))]
  const sum = (value: Expr): Expr => orZero(call('sum', [value]))
  switch (total.kind) {
    case 'persons':
      return [target(total.filter === null ? call('count', [], { star: true }) : sum(n), countName(i))]
    case 'rows':
      return [target(sum(n), countName(i))]
    case 'sum':
      return [target(sum(s), sumName(i))]
    case 'twin': {
      const width = total.units.high - total.units.low
      return [target(sum(s), sumName(i)), target(sum(operator(operator(cast(n, 'numeric'), '*', numeric(width.toString())), '-', s)), countName(i))]
    }
    case 'triple': {
      const width = total.units.high - total.units.low
      const u = column('q', squareName(i))
      const whole = operator(cast(n, 'numeric'), '*', numeric((width * width).toString()))
      return [target(sum(s), sumName(i)), target(sum(u), squareName(i)), target(sum(operator(operator(whole, '-', s), '-', u)), countName(i))]
    }
  }
}
