import { bodyQuery, call, cast, column, constant, integer, logic, operator, selectQuery, subquery, target } from '../catalog/build.ts'
import { parts, scansOf, type Scalar } from '../catalog/scalar.ts'
import { listedRows } from '../plan/fan-out.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import type { Scan, Source } from '../plan/relation.ts'
import type { DataColumn } from '../policy/data-set.ts'
import type { Expr, FromItem } from '../sql/tree.ts'
import { type FixedValues, printOwn, printScalar, scanName } from './print-scalar.ts'

export function allOf(tests: readonly Expr[]): Expr | null {
  return tests.length === 0 ? null : logic('and', tests)
}

/** Columns each scan is read for: no other column of a table enters the vault's SQL. */
export type ReadColumns = ReadonlyMap<number, ReadonlySet<string>>

/** Everything a plan evaluates. */
export function* scalarsOf(plan: ReleasePlan): Generator<Scalar> {
  yield* testsIn(plan.owned.source)
  for (const key of plan.keys) yield key.scalar
  for (const total of plan.totals) {
    if (total.filter !== null) yield total.filter
    if (total.kind === 'rows' && total.of !== null) yield total.of
    if (total.kind === 'sum' || total.kind === 'twin' || total.kind === 'triple') yield total.units.value
  }
  for (const scan of plan.scans) yield* listedIn(scan)
}

export function* listedIn(scan: Scan): Generator<Scalar> {
  if (scan.table.kind !== 'listed') return
  if (scan.table.source.kind === 'series') yield* scan.table.source.args
  else for (const row of scan.table.source.rows) yield* row
}

export function* testsIn(source: Source): Generator<Scalar> {
  if (source.kind === 'filter') {
    yield* source.tests
    yield* testsIn(source.input)
  }
  if (source.kind === 'join') {
    yield* source.on
    yield* testsIn(source.left)
    yield* testsIn(source.right)
  }
}

export function readColumns(plan: ReleasePlan): ReadColumns {
  const read = new Map<number, Set<string>>()
  const add = (scan: number, name: string): void => {
    const names = read.get(scan) ?? new Set()
    read.set(scan, names.add(name))
  }
  add(plan.owned.person.scan, plan.owned.person.column)
  for (const index of plan.fanOut.capped.keys()) {
    const table = plan.scans.find((scan) => scan.index === index)?.table
    if (table?.kind === 'private' && table.owner.kind === 'column') add(index, table.owner.column)
  }
  for (const scalar of scalarsOf(plan)) for (const part of parts(scalar)) if (part.node.kind === 'column') add(part.node.scan, part.node.column)
  return read
}

export interface PrintedSource {
  readonly from: FromItem
  readonly tests: readonly Scalar[]
}

export interface SourceContext {
  readonly fixed: FixedValues
  readonly read: ReadColumns
  readonly capped: ReadonlyMap<number, bigint>
  readonly counted: readonly number[]
  /** Conditions that hold on every row of the relation: one on a capped scan alone is applied before its cap as well. */
  readonly everywhere: readonly Scalar[]
  /** Scans on the padded side of a LEFT JOIN: a condition applied before it would make padding rows. */
  readonly padded: ReadonlySet<number>
}

/** FROM as SQL, and the conditions left for WHERE. A filter below the padded side of a LEFT JOIN moves into its ON, which means the same. */
export function printSource(source: Source, context: SourceContext): PrintedSource {
  switch (source.kind) {
    case 'scan':
      return { from: printScan(source.scan, context), tests: [] }
    case 'filter': {
      const input = printSource(source.input, context)
      return { from: input.from, tests: [...input.tests, ...source.tests] }
    }
    case 'join': {
      const [left, right] = [printSource(source.left, context), printSource(source.right, context)]
      const outer = source.type === 'left'
      const on = [...source.on, ...(outer ? right.tests : [])]
      const condition = allOf(on.map((test) => printScalar(test, context.fixed))) ?? constant({ kind: 'boolean', value: true })
      return { from: joined(source.type, left.from, right.from, condition), tests: outer ? left.tests : [...left.tests, ...right.tests] }
    }
  }
}

export function joined(type: 'inner' | 'left', left: FromItem, right: FromItem, on: Expr | null): FromItem {
  return { kind: 'join', type, natural: false, left, right, using: [], usingAlias: null, on, alias: null, at: -1 }
}

function printScan(scan: Scan, context: SourceContext): FromItem {
  const alias = scanName(scan.index)
  const table = scan.table
  if (table.kind === 'listed') return printListed(table, alias, context)
  const plain: FromItem = { kind: 'table', name: [table.schema, table.name], only: false, alias: { name: alias, columns: [] }, at: -1 }
  const cap = context.capped.get(scan.index)
  const columns = [...(context.read.get(scan.index) ?? [])].sort()
  if (cap !== undefined) return printCapped(scan, plain, columns, cap, context)
  if (!context.counted.includes(scan.index)) return plain
  const limited = selectQuery({ targets: columns.map((name) => target(column(alias, name), name)), from: [plain] })
  return subquery({ ...limited, limit: integer(listedRows) }, alias)
}

/** The first `cap` rows of each person, in a total order over every column that is read. INVARIANT OWNED (ties): rows that tie are alike. */
function printCapped(scan: Scan, plain: FromItem, columns: readonly string[], cap: bigint, context: SourceContext): FromItem {
  const alias = scanName(scan.index)
  const owner = scan.table.kind === 'private' && scan.table.owner.kind === 'column' ? scan.table.owner.column : ''
  const tests = context.everywhere.filter((test) => {
    if (context.padded.has(scan.index)) return false
    const scans = scansOf(test)
    return scans.size === 1 && scans.has(scan.index)
  })
  const rank = call('row_number', [], {
    over: {
      name: '',
      refers: '',
      partition: [column(alias, owner)],
      order: columns
        .flatMap((name) => totalOrder(column(alias, name), scan.table.columns.get(name)))
        .map((by) => ({ by, direction: 'default', using: [], nulls: 'default' })),
      frame: plainFrame,
    },
  })
  const ranked = selectQuery({
    targets: [...columns.map((name) => target(column(alias, name), name)), target(rank, 'place')],
    from: [plain],
    where: allOf(tests.map((test) => printScalar(test, context.fixed))),
  })
  const kept = selectQuery({
    targets: columns.map((name) => target(column('ranked', name), name)),
    from: [subquery(ranked, 'ranked')],
    where: operator(column('ranked', 'place'), '<=', integer(cap)),
  })
  return subquery(kept, alias)
}

/** What orders a column's values so that those that tie are alike in every respect: 1.0 and 1.00, 0 and -0, a month and 30 days are equal, and print apart. */
function totalOrder(value: Expr, of: DataColumn | undefined): readonly Expr[] {
  if (of === undefined || of.type.kind !== 'base') return [value]
  if (!of.deterministic) return [value, { kind: 'collate', arg: value, collation: ['pg_catalog', 'C'], at: -1 }]
  switch (of.type.name) {
    case 'numeric':
    case 'float4':
    case 'float8':
    case 'interval':
      return [value, cast(value, 'text')]
    case 'bpchar':
      return [value, call('octet_length', [value])]
    default:
      return [value]
  }
}

/** FRAMEOPTION_DEFAULTS of PostgreSQL: RANGE UNBOUNDED PRECEDING AND CURRENT ROW, not written out. */
export const plainFrame = { options: 1058, start: null, end: null } as const

function printListed(table: Extract<Scan['table'], { kind: 'listed' }>, alias: string, context: SourceContext): FromItem {
  const columns = [...table.columns.keys()]
  if (table.source.kind === 'series') {
    // in a SELECT list its rows come one by one, in FROM PostgreSQL would make all of them first
    const series = call(
      'generate_series',
      table.source.args.map((arg) => printOwn(arg, context.fixed)),
    )
    return subquery(selectQuery({ targets: [target(series, columns[0] ?? 'v')], from: [] }), alias, columns)
  }
  const types = [...table.columns.values()].map((each) => each.type)
  const rows = table.source.rows.map((row) => row.map((value, i) => cast(printOwn(value, context.fixed), types[i]?.name ?? 'text', types[i]?.schema)))
  return subquery(bodyQuery({ kind: 'values', rows }), alias, columns)
}
