import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import type { CatalogType } from '../catalog/catalog.ts'
import { castTo } from '../catalog/functions/casts.ts'
import { settle } from '../catalog/functions/comparisons.ts'
import { type Clamp, isFixed, type Scalar } from '../catalog/scalar.ts'
import { promote, isNumber, scalarType, scalarTypeOf, type ScalarType } from '../catalog/scalar-type.ts'
import type { DataColumn } from '../policy/data-set.ts'
import type { FromItem, Values } from '../sql/tree.ts'
import type { Context } from './context.ts'
import { lowerExpr } from './lower-expr.ts'
import type { Lowered } from './lower-from.ts'
import type { Rows } from './lower-rows.ts'
import type { ListedRows, Scan } from './relation.ts'
import type { VisibleColumn } from './scope.ts'

const nowhere = { items: [], star: [] }

function columnOf(name: string, type: ScalarType, notNull: boolean): DataColumn {
  const catalogType: CatalogType = {
    schema: type.schema,
    name: type.name,
    printed: type.name,
    modifier: -1,
    kind: type.family === 'enum' ? 'enum' : 'base',
    labels: [],
  }
  return { name, type: catalogType, notNull, deterministic: true, role: 'listed', clamp: null, step: null, values: null, valuesFrom: null }
}

function scanOf(table: ListedRows, context: Context, at: number, offers: Clamp | null): { readonly scan: Scan; readonly columns: readonly VisibleColumn[] } {
  const scan: Scan = { index: context.scans.length, table, at }
  context.scans.push(scan)
  const columns = [...table.columns.values()].map((column): VisibleColumn => {
    const type = scalarTypeOf(column.type) ?? refuse('expr.unsupported', { what: `a list of ${column.type.name}` }, at)
    return {
      name: column.name,
      scalar: {
        type,
        node: { kind: 'column', scan: scan.index, column: column.name, clamped: null, offers },
        nullable: !column.notNull,
        range: null,
        carrier: 'own',
        at,
      },
    }
  })
  return { scan, columns }
}

function fixed(scalar: Scalar): Scalar {
  return isFixed(scalar) ? scalar : refuse('block.shape', { what: 'a list that differs from row to row' }, scalar.at)
}

/** VALUES (…), (…): rows the statement lists itself. */
export function lowerValues(values: Values, context: Context, at: number): Rows {
  const rows = values.rows.map((row) => row.map((value) => fixed(lowerExpr(value, nowhere, context))))
  const [first = []] = rows
  const types = first.map((_, i) => columnType(rows.map((row) => row[i]).filter((value) => value !== undefined)))
  const settled = rows.map((row) => row.map((value, i) => settle(value, types[i] ?? value.type)))
  const columns = types.map((type, i) =>
    columnOf(
      `column${String(i + 1)}`,
      type,
      settled.every((row) => row[i]?.nullable === false),
    ),
  )
  const table: ListedRows = {
    kind: 'listed',
    name: 'VALUES',
    source: { kind: 'values', rows: settled },
    columns: new Map(columns.map((column) => [column.name, column])),
  }
  const made = scanOf(table, context, at, null)
  return { source: { kind: 'scan', scan: made.scan }, columns: made.columns }
}

function columnType(values: readonly Scalar[]): ScalarType {
  const known = values.map((value) => value.type).filter((type) => type.family !== 'unknown')
  const [first] = known
  if (first === undefined) return scalarType('text')
  return known.every(isNumber) ? known.reduce(promote) : first
}

/** generate_series over fixed bounds, the only function that may stand in a FROM beside private rows. */
export function lowerListed(item: Extract<FromItem, { kind: 'function' }>, context: Context): Lowered {
  const [only, more] = item.functions
  const call = only?.call
  if (call?.kind !== 'call' || more !== undefined || call.name.at(-1) !== 'generate_series' || item.rowsFrom || item.ordinality || item.definitions.length > 0)
    return refuse('block.mixed', { what: 'a function in FROM other than generate_series' }, item.at)
  const written = call.args.map((arg) => fixed(lowerExpr(arg, nowhere, context)))
  const type = seriesType(written, item.at)
  if (isNought(written[2])) refuse('expr.unsupported', { what: 'generate_series by a step of 0' }, item.at)
  const step = type.family === 'integer' ? type : scalarType('interval')
  const args = written.map((arg, i) => castTo(arg, i === 2 ? step : type, arg.at))
  const name = item.alias?.columns[0] ?? item.alias?.name ?? 'generate_series'
  const table: ListedRows = {
    kind: 'listed',
    name: 'generate_series',
    source: { kind: 'series', args },
    columns: new Map([[name, columnOf(name, type, true)]]),
  }
  const made = scanOf(table, context, item.at, endsOf(written))
  return {
    source: { kind: 'scan', scan: made.scan },
    scope: { items: [{ name: item.alias?.name ?? 'generate_series', schema: '', columns: made.columns }], star: made.columns },
  }
}

/** A series by nought raises where it runs, and it may run beside rows. */
function isNought(step: Scalar | undefined): boolean {
  if (step === undefined) return false
  if (step.range !== null) return !step.range.low.isPositive() && !step.range.high.isLess(Fraction.zero)
  return step.node.kind === 'constant' && !/[1-9]/.test(step.node.text ?? '')
}

/** What a rising series stays within, where its ends are plain constants: it bounds what is computed from it, as a clamp would. */
function endsOf(args: readonly Scalar[]): Clamp | null {
  const [low, high, step] = args.map((arg) => (arg.node.kind === 'constant' ? arg.node.text : null))
  if (low == null || high == null) return null
  if (args[0]?.type.family === 'integer' && ![low, high].every((end) => /^-?\d+$/.test(end))) return null
  const rises = args.length < 3 || (step != null && /^[\d :.a-z]+$/i.test(step) && !/ago/i.test(step))
  return rises ? { low, high, step: null } : null
}

function seriesType(args: readonly Scalar[], at: number): ScalarType {
  const [first, second, third] = args
  if (first === undefined || second === undefined || args.length > 3) return refuse('expr.unsupported', { what: 'generate_series in this form' }, at)
  if (args.every((arg) => arg.type.family === 'integer'))
    return args.map((arg) => arg.type).reduce(promote).name === 'int8' ? scalarType('int8') : scalarType('int4')
  if (third !== undefined && (third.type.family === 'interval' || third.type.family === 'unknown')) {
    const families = [first.type.family, second.type.family]
    if (families.every((family) => family === 'timestamp')) return scalarType('timestamp')
    if (families.every((family) => family === 'timestamptz' || family === 'date' || family === 'timestamp' || family === 'unknown'))
      return scalarType('timestamptz')
  }
  return refuse('expr.unsupported', { what: 'generate_series in this form' }, at)
}
