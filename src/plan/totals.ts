import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import { clamped } from '../catalog/functions/clamped.ts'
import { parts, sameScalar, scansOf, type Scalar } from '../catalog/scalar.ts'
import { isNumber } from '../catalog/scalar-type.ts'
import type { Call } from '../sql/tree.ts'
import type { Context } from './context.ts'
import type { FanOut } from './fan-out.ts'
import { columnOf } from './key-domain.ts'
import { provedStep } from './lower-column.ts'
import { lowerCondition, lowerExpr } from './lower-expr.ts'
import type { Owned } from './owned.ts'
import { keepsPadding, paddingValue } from './padding.ts'
import type { Output, Spread, Total, Units } from './release-plan.ts'
import { scansIn, type Scan } from './relation.ts'
import type { Scope } from './scope.ts'

/** An aggregate call read: what it counts or adds, over which rows. */
export type Aggregate =
  | { readonly kind: 'rows'; readonly of: Scalar | null; readonly filter: Scalar | null; readonly at: number }
  | { readonly kind: 'persons'; readonly filter: Scalar | null; readonly at: number }
  | { readonly kind: 'sum' | 'mean'; readonly of: Scalar; readonly filter: Scalar | null; readonly at: number }
  | { readonly kind: 'spread'; readonly spread: Spread; readonly of: Scalar; readonly filter: Scalar | null; readonly at: number }

const spreads: Readonly<Record<string, Spread>> = {
  var_pop: 'var_pop',
  var_samp: 'var_samp',
  variance: 'var_samp',
  stddev_pop: 'stddev_pop',
  stddev_samp: 'stddev_samp',
  stddev: 'stddev_samp',
}

/** Reads one aggregate call over the block's relation, or refuses it. */
export function lowerAggregate(call: Call, scope: Scope, owned: Owned, context: Context): Aggregate {
  const name = call.name.at(-1) ?? ''
  const filter = call.filter === null ? null : lowerCondition(call.filter, scope, context)
  if (call.order.length > 0 || call.variadic || call.within) return refuse('block.aggregate', { what: `${name} in this form` }, call.at)
  const [first, more] = call.args
  if (name === 'count' && call.star) return checkPadding({ kind: 'rows', of: null, filter, at: call.at }, 'count(*)', owned)
  if (first === undefined || more !== undefined) return refuse('block.aggregate', { what: name }, call.at)
  const of = lowerExpr(first, scope, context)
  if (name === 'count' && call.distinct) {
    if (of.node.kind !== 'column' || !owned.classes.same({ scan: of.node.scan, column: of.node.column }, owned.person))
      refuse('block.aggregate', { what: 'count(DISTINCT …) of anything but the person' }, call.at)
    return { kind: 'persons', filter, at: call.at }
  }
  if (call.distinct) return refuse('block.aggregate', { what: `${name}(DISTINCT …)` }, call.at)
  if (name === 'count') return checkPadding({ kind: 'rows', of, filter, at: call.at }, 'this count', owned)
  const spread = spreads[name]
  if (name !== 'sum' && name !== 'avg' && spread === undefined) return refuse('block.aggregate', { what: name }, call.at)
  if (!isNumber(of.type)) return refuse('block.aggregate', { what: `${name} over ${of.type.name}` }, call.at)
  if (spread !== undefined) return checkPadding({ kind: 'spread', spread, of, filter, at: call.at }, name, owned)
  return checkPadding({ kind: name === 'sum' ? 'sum' : 'mean', of, filter, at: call.at }, name, owned)
}

function checkPadding<A extends Aggregate>(aggregate: A, what: string, owned: Owned): A {
  if (owned.paddedScans.size === 0 || !keepsPadding(aggregate.filter, owned.paddedScans)) return aggregate
  const of = 'of' in aggregate ? aggregate.of : null
  const value = of === null ? 'unknown' : paddingValue(of, owned.paddedScans)
  if (value === 'null' || (value === 'zero' && aggregate.kind === 'sum')) return aggregate
  return refuse('join.padding', { what }, aggregate.at)
}

/** Rows of a person that count in one group: those of the table whose rows are counted, or fewer where the analyst says so. */
export function rowsFor(reads: ReadonlySet<number>, owned: Owned, fanOut: FanOut, limit: bigint | null): bigint {
  if (fanOut.single) return 1n
  const many = [...scansIn(owned.source)].filter((scan) => fanOut.leaves.has(scan.index))
  const read = many.filter((scan) => reads.has(scan.index))
  const tables = (read.length > 0 ? read : many).map(boundsOf)
  const rows = tables.map((bounds) => bounds.rows).reduce((a, b) => (a > b ? a : b), 1n)
  return limit !== null && limit < rows ? limit : rows
}

/** Groups a person may touch. */
export function groupsFor(owned: Owned, fanOut: FanOut, limit: bigint | null): bigint {
  const scans = [...scansIn(owned.source)].filter((scan) => scan.table.kind === 'private')
  const many = scans.filter((scan) => fanOut.leaves.has(scan.index))
  const groups = (many.length > 0 ? many : scans).map((scan) => boundsOf(scan).groups).reduce((a, b) => (a > b ? a : b), 1n)
  return limit !== null && limit < groups ? limit : groups
}

function boundsOf(scan: Scan): { readonly groups: bigint; readonly rows: bigint } {
  if (scan.table.kind !== 'private') return { groups: 1n, rows: 1n }
  return { groups: BigInt(scan.table.bounds.groups), rows: BigInt(scan.table.bounds.rows) }
}

const most = 2n ** 62n

/** The value on its grid; refused where no range bounds it or where the sums could leave 62 bits. */
export function unitsOf(of: Scalar, name: string, rows: bigint, scans: readonly Scan[]): Units {
  for (const part of parts(of)) {
    const column = part.node.kind === 'column' ? columnOf(part.node.scan, part.node.column, scans) : null
    if (column?.role === 'linking') refuse('rows.person', { column: column.name }, part.at)
  }
  const column = of.node.kind === 'column' ? columnOf(of.node.scan, of.node.column, scans) : null
  const bounded = clamped(of)
  if (bounded.range === null || (column !== null && column.clamp === null))
    refuse('expr.clamp', { what: name, expression: column === null ? 'this expression' : `"${column.name}"` }, of.at)
  const step = column?.step != null && of.type.family === 'integer' ? Fraction.parse(column.step) : gridOf(bounded, column === null ? null : provedStep(column))
  const [low, high] = [bounded.range.low.div(step).floor(), bounded.range.high.div(step).ceil()]
  const size = [low, high].map((units) => (units < 0n ? -units : units)).reduce((a, b) => (a > b ? a : b))
  if (size * rows * 2n >= most) refuse('expr.clamp', { what: name, expression: 'a narrower clamp or a coarser step for this value; its' }, of.at)
  return { value: bare(bounded), step, low, high }
}

/** A bare column is put on its grid by the total itself, once. */
function bare(value: Scalar): Scalar {
  if (value.node.kind !== 'column' || value.node.clamped === null) return value
  return { ...value, node: { ...value.node, clamped: { ...value.node.clamped, step: null } }, carrier: value.type.family === 'float' ? 'numeric' : 'own' }
}

/** The proved grid, or one of about a millionth of the range, a power of ten. */
function gridOf(value: Scalar, proved: Fraction | null): Fraction {
  const step = value.range?.step ?? proved
  if (step !== null && step.isPositive()) return step
  const range = value.range ?? { low: Fraction.zero, high: Fraction.one }
  const width = range.low.equals(range.high) ? range.low.max(range.low.neg()) : range.high.sub(range.low)
  if (width.isZero()) return Fraction.one
  let grid = Fraction.one
  const [ten, fine] = [Fraction.make(10n), Fraction.make(1n, 1_000_000n)]
  while (grid.isLess(width.mul(fine))) grid = grid.mul(ten)
  while (!grid.div(ten).isLess(width.mul(fine))) grid = grid.div(ten)
  return grid
}

/** Aggregates that share a value and a filter share totals: a mean brings its count and sum along. */
export function totalsOf(
  aggregates: readonly Aggregate[],
  owned: Owned,
  fanOut: FanOut,
  limit: bigint | null,
  scans: readonly Scan[],
): { readonly totals: readonly Total[]; readonly outputs: readonly Output[] } {
  const totals: Total[] = []
  const add = (total: Total): number => {
    const found = totals.findIndex((other) => sameTotal(other, total))
    return found >= 0 ? found : totals.push(total) - 1
  }
  const rows = (of: Scalar | null, filter: Scalar | null): bigint =>
    rowsFor(new Set([...(of === null ? [] : scansOf(of)), ...(of === null && filter !== null ? scansOf(filter) : [])]), owned, fanOut, limit)
  const twin = (of: Scalar, filter: Scalar | null): number => {
    const units = unitsOf(of, 'avg', rows(of, filter), scans)
    // twins share out the width between them, so there must be one
    const low = units.low === units.high ? units.low - 1n : units.low
    return add({ kind: 'twin', units: { ...units, low }, filter, rows: rows(of, filter) })
  }
  const hasMean = (of: Scalar, filter: Scalar | null): boolean =>
    aggregates.some((other) => other.kind === 'mean' && sameScalar(other.of, of) && sameFilter(other.filter, filter))
  const outputs = aggregates.map((aggregate): Output => {
    switch (aggregate.kind) {
      case 'persons':
        return { kind: 'count', total: add({ kind: 'persons', filter: aggregate.filter }) }
      case 'rows': {
        const of = aggregate.of
        if (of !== null && isNumber(of.type) && hasMean(of, aggregate.filter)) return { kind: 'count', total: twin(of, aggregate.filter) }
        return {
          kind: 'count',
          total: add({ kind: 'rows', of: of !== null && !of.nullable ? null : of, filter: aggregate.filter, rows: rows(of, aggregate.filter) }),
        }
      }
      case 'sum':
        if (hasMean(aggregate.of, aggregate.filter)) return { kind: 'sum', total: twin(aggregate.of, aggregate.filter) }
        return {
          kind: 'sum',
          total: add({
            kind: 'sum',
            units: unitsOf(aggregate.of, 'sum', rows(aggregate.of, aggregate.filter), scans),
            filter: aggregate.filter,
            rows: rows(aggregate.of, aggregate.filter),
          }),
        }
      case 'mean':
        return { kind: 'mean', total: twin(aggregate.of, aggregate.filter) }
      case 'spread': {
        const units = coarse(unitsOf(aggregate.of, aggregate.spread, rows(aggregate.of, aggregate.filter), scans), rows(aggregate.of, aggregate.filter))
        return {
          kind: 'spread',
          of: aggregate.spread,
          total: add({ kind: 'triple', units, filter: aggregate.filter, rows: rows(aggregate.of, aggregate.filter) }),
        }
      }
    }
  })
  return { totals, outputs }
}

/** The same value on a grid so coarse that the squares of a person's rows fit 62 bits, and with a width to share out. */
function coarse(units: Units, rows: bigint): Units {
  let { step, low, high } = units
  const ten = Fraction.make(10n)
  while ((high - low) * (high - low) * rows * 2n >= most) {
    step = step.mul(ten)
    low = Fraction.make(low).div(ten).floor()
    high = Fraction.make(high).div(ten).ceil()
  }
  return { ...units, step, low: low === high ? low - 1n : low, high }
}

function sameFilter(a: Scalar | null, b: Scalar | null): boolean {
  return a === null || b === null ? a === b : sameScalar(a, b)
}

function sameTotal(a: Total, b: Total): boolean {
  if (a.kind !== b.kind || !sameFilter(a.filter, b.filter)) return false
  if (a.kind === 'persons' || b.kind === 'persons') return true
  if (a.rows !== b.rows) return false
  if (a.kind === 'rows' || b.kind === 'rows') return a.kind === 'rows' && b.kind === 'rows' && sameFilter(a.of, b.of)
  return sameScalar(a.units.value, b.units.value)
}
