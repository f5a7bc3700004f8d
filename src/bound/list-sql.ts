import { unreachable } from '../base/check.ts'
import { bodyQuery, call, cast, column, integer, isNull, nothing, selectQuery, subquery, target, text } from '../catalog/build.ts'
import type { Scalar } from '../catalog/scalar.ts'
import type { ListFactor, ReleasePlan } from '../plan/release-plan.ts'
import type { Source } from '../plan/relation.ts'
import type { Expr, FromItem, Query, Target } from '../sql/tree.ts'
import { type FixedValues, printKey, printOwn, printScalar } from './print-scalar.ts'
import { allOf, joined, printSource } from './print-source.ts'

const units: Readonly<Record<string, string>> = {
  quarter: '3 months',
  decade: '10 years',
  century: '100 years',
  millennium: '1000 years',
  microseconds: '1 microsecond',
  milliseconds: '1 millisecond',
}

/**
 * The query that lists every group, over published data and fixed values only: it runs in the lobby, before anything is debited. One text column a key,
 * in the order of the keys.
 */
export function listSql(plan: ReleasePlan, fixed: FixedValues): Query {
  const factors = plan.groups.kind === 'listed' ? plan.groups.factors : []
  const items = factors.map((factor, i) => subquery(factorSql(plan, factor, fixed), `f${i.toString()}`))
  const from = items.reduce<FromItem | null>(
    (left, right) => (left === null ? right : joined('inner', left, right, { kind: 'constant', constant: { kind: 'boolean', value: true }, at: -1 })),
    null,
  )
  const place = (key: number): string => `f${factors.findIndex((factor) => keysOf(factor).includes(key)).toString()}`
  return selectQuery({
    targets: plan.keys.map((_, key) => target(cast(column(place(key), `k${key.toString()}`), 'text'), `k${key.toString()}`)),
    from: from === null ? [] : [from],
  })
}

function keysOf(factor: ListFactor): readonly number[] {
  return factor.kind === 'component' ? factor.keys : [factor.key]
}

function factorSql(plan: ReleasePlan, factor: ListFactor, fixed: FixedValues): Query {
  const name = `k${keysOf(factor)[0]?.toString() ?? ''}`
  switch (factor.kind) {
    case 'texts': {
      const value = (entry: string | null): Expr => printKey(literal(factor.type, entry), fixed)
      const rows = factor.texts.map((entry) => [cast(value(entry), factor.type.family === 'unknown' ? 'text' : factor.type.name, factor.type.schema)])
      const values: Query = bodyQuery({ kind: 'values', rows })
      return distinct([target(column('v', name), name)], subquery(values, 'v', [name]), [])
    }
    case 'column': {
      const [schema = '', table = ''] = factor.table.split('.')
      const from: FromItem = { kind: 'table', name: [schema, table], only: false, alias: { name: 'v', columns: [] }, at: -1 }
      const value = column('v', factor.column)
      return withNull(distinct([target(value, name)], from, [isNull(value, true)]), factor.nullable, [name])
    }
    case 'instants': {
      const args = [printOwn(factor.low, fixed), printOwn(factor.high, fixed), cast(text(units[factor.unit] ?? `1 ${factor.unit}`), 'interval')]
      const start = call('date_trunc', [text(factor.unit), column('v', 'v')])
      const value = factor.type.name === factor.low.type.name ? start : cast(start, factor.type.name, factor.type.schema)
      return withNull(distinct([target(value, name)], series(args), []), factor.nullable, [name])
    }
    case 'numbers': {
      const args = [factor.low, factor.high].map((end) => cast(printScalar(end, fixed), 'int8'))
      const own = cast(column('v', 'v'), factor.type.name, factor.type.schema)
      return withNull(distinct([target(factor.type.family === 'numeric' ? call('trim_scale', [own]) : own, name)], series(args), []), factor.nullable, [name])
    }
    case 'component': {
      const names = factor.keys.map((key) => `k${key.toString()}`)
      const printed = printSource(factor.source, { fixed, read: new Map(), capped: new Map(), counted: [], everywhere: [], padded: new Set() })
      const targets = factor.keys.map((key, i) => target(printKey(keyScalar(plan, key), fixed), names[i] ?? ''))
      return withNull(
        distinct(
          targets,
          printed.from,
          [...printed.tests, ...factor.tests].map((test) => printScalar(test, fixed)),
        ),
        factor.padded,
        names,
      )
    }
    default:
      return unreachable(factor)
  }
}

function keyScalar(plan: ReleasePlan, key: number): Scalar {
  const found = plan.keys[key]
  if (found === undefined) throw new RangeError('a list speaks of a key the plan lacks')
  return found.scalar
}

function literal(type: Scalar['type'], entry: string | null): Scalar {
  return { type, node: { kind: 'constant', text: entry }, nullable: entry === null, range: null, carrier: 'own', at: -1 }
}

/** More than any list may have, even where a few steps fall on one value: a clamp of years by the microsecond is not worked off. */
const longestSeries = 25_000n

function series(args: readonly Expr[]): FromItem {
  return subquery({ ...selectQuery({ targets: [target(call('generate_series', args), 'v')], from: [] }), limit: integer(longestSeries) }, 'v')
}

function distinct(targets: readonly Target[], from: FromItem, tests: readonly Expr[]): Query {
  return selectQuery({ distinct: [], targets, from: [from], where: allOf(tests) })
}

/** The list with a row of NULLs, where the keys can be NULL. */
function withNull(query: Query, nullable: boolean, names: readonly string[]): Query {
  if (!nullable) return query
  // in VALUES a bare NULL would be text
  const nulls = selectQuery({ targets: names.map((name) => target(nothing(), name)), from: [] })
  return bodyQuery({ kind: 'set-operation', word: 'union', all: false, left: query, right: nulls })
}

/** How many rows a published side has that is not joined on a unique key; the lobby counts before anything is debited. */
export function countSql(plan: ReleasePlan, scan: number, ceiling: bigint, fixed: FixedValues): Query {
  const found = plan.scans.find((each) => each.index === scan)
  if (found === undefined) throw new RangeError('a count speaks of a scan the plan lacks')
  const source: Source = { kind: 'scan', scan: found }
  const printed = printSource(source, { fixed, read: new Map(), capped: new Map(), counted: [], everywhere: [], padded: new Set() })
  const rows = selectQuery({ targets: [target(text(''), 'row')], from: [printed.from] })
  const limited: Query = { ...rows, limit: cast(text((ceiling + 1n).toString()), 'int8') }
  return selectQuery({ targets: [target(cast(call('count', [], { star: true }), 'text'), 'count')], from: [subquery(limited, 'counted')] })
}
