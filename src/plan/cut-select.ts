import { functionItem, hedgerowCall, positions, selectQuery } from '../catalog/build.ts'
import { refuse } from '../base/refusal.ts'
import { sameExpr } from '../sql/equal.ts'
import { labelOf } from '../sql/label.ts'
import { children, mapExpr, mapOrder, mapWindow } from '../sql/walk.ts'
import { mapQuery } from '../sql/walk-query.ts'
import type { Call, CommonTable, Expr, Query, Select, SortItem } from '../sql/tree.ts'
import { asAggregate } from './aggregates.ts'
import type { CutBlock } from './cut.ts'
import { findTable } from './names.ts'
import { queryReads } from './query-reads.ts'
import type { Names } from './rows-level.ts'
import { namedItems, type NamedItem } from './visible-names.ts'

/** Each pull carries the texts of all blocks of its statement, and each total is compared with every other: both grow with the square. */
const blockCeiling = 100
const callCeiling = 200

/** The name a block's released rows go by in the rewritten statement. */
export function releasedName(block: number): string {
  return `released_${String(block + 1)}`
}

/** The function a block is replaced by until its columns are described. */
export function placeholderName(block: number): string {
  return `block ${String(block)}`
}

interface Cutting {
  readonly items: readonly NamedItem[]
  readonly keys: { readonly written: Expr; readonly canonical: Expr }[]
  readonly calls: { readonly written: Call; readonly canonical: Expr }[]
  readonly block: number
  readonly inside: (expr: Expr) => Expr
}

/**
 * Cuts an aggregating SELECT over private rows: keys and aggregate calls go into the block; the rest stays and reads the released columns instead.
 * HAVING becomes WHERE over them. `inside` cuts blocks out of subqueries in the rest.
 */
export function cutSelect(query: Query, select: Select, names: Names, blocks: CutBlock[], inside: (expr: Expr) => Expr): Query {
  const items = namedItems(select.from, names.dataSet, names.rows)
  const block = blocks.length
  if (block === blockCeiling) refuse('block.too-many', { what: 'tables of aggregates', ceiling: blockCeiling.toString() }, select.from[0]?.at ?? -1)
  const cutting: Cutting = { items, keys: [], calls: [], block, inside }
  for (const key of groupKeys(select, items)) addKey(cutting, key)
  // the block keeps its place before those that its own post-processing cuts out
  const slot = blocks.push({ query, parameters: [], names: [] }) - 1
  const targets = select.targets.map((target) => ({ value: rest(target.value, cutting), label: labelOf(target), at: target.at }))
  const having = select.having === null ? null : rest(select.having, cutting)
  const windows = select.windows.map((window) => mapWindow(window, (e) => rest(e, cutting)))
  const distinct =
    select.distinct === null ? null : select.distinct.map((e) => sorted({ by: e, direction: 'default', using: [], nulls: 'default' }, select, cutting).by)
  const order = query.order.map((item) => sorted(item, select, cutting))
  blocks[slot] = blockOf(select, cutting, names)
  const from = [functionItem(hedgerowCall(placeholderName(block), []), { name: releasedName(block), columns: [] })]
  const body: Select = { kind: 'select', distinct, targets, from, where: having, group: [], groupDistinct: false, having: null, windows }
  const edge = (e: Expr | null): Expr | null => (e === null ? null : rest(e, cutting))
  return { ...query, body, order, limit: edge(query.limit), offset: edge(query.offset) }
}

function groupKeys(select: Select, items: readonly NamedItem[]): readonly Expr[] {
  return select.group.map((item) => {
    if (item.kind !== 'expression') return refuse('block.shape', { what: item.kind === 'sets' ? item.word.toUpperCase() : 'GROUP BY ()' }, item.at)
    const value = item.value
    if (value.kind === 'constant' && value.constant.kind === 'integer') {
      const ordinal = value.constant.value
      const target = select.targets.find((_, i) => String(i + 1) === ordinal)
      return target?.value ?? refuse('block.shape', { what: `GROUP BY ${ordinal}` }, value.at)
    }
    // a bare name is a column of FROM first, and only then a label of the list
    if (value.kind === 'column' && value.name.length === 1 && !items.some((each) => each.columns.includes(value.name[0] ?? ''))) {
      const labelled = select.targets.find((target) => labelOf(target) === value.name[0])
      if (labelled !== undefined) return labelled.value
    }
    return value
  })
}

/** The expression with every column written as item.column, for comparing. */
function canonical(expr: Expr, items: readonly NamedItem[]): Expr {
  if (expr.kind === 'column' && !expr.star) {
    const column = expr.name.at(-1) ?? ''
    const table = expr.name.at(-2)
    const item = table === undefined ? items.find((each) => each.columns.includes(column)) : items.find((each) => each.name === table)
    return item === undefined ? expr : { ...expr, name: [item.name, column] }
  }
  return mapExpr(expr, (child) => canonical(child, items))
}

function addKey(cutting: Cutting, written: Expr): number {
  const form = canonical(written, cutting.items)
  const found = cutting.keys.findIndex((key) => sameExpr(key.canonical, form))
  return found >= 0 ? found : cutting.keys.push({ written, canonical: form }) - 1
}

/** A released column is named by what it is, since keys may still be added: k0, k1, … and a0, a1, …; `rewrite.ts` gives them their places. */
function released(cutting: Cutting, name: string, at: number): Expr {
  return { kind: 'column', name: [releasedName(cutting.block), name], star: false, at }
}

/** What stays of an expression outside the block. */
function rest(expr: Expr, cutting: Cutting): Expr {
  const form = canonical(expr, cutting.items)
  const key = cutting.keys.findIndex((each) => sameExpr(each.canonical, form))
  if (key >= 0 && expr.kind !== 'constant') return released(cutting, `k${String(key)}`, expr.at)
  const call = asAggregate(expr)
  if (call !== null) {
    if (children(call).some((child) => asAggregate(child) !== null)) refuse('block.shape', { what: 'an aggregate inside an aggregate' }, expr.at)
    const found = cutting.calls.findIndex((each) => sameExpr(each.canonical, form))
    if (found < 0 && cutting.calls.length === callCeiling)
      refuse('block.too-many', { what: 'aggregates in one SELECT', ceiling: callCeiling.toString() }, expr.at)
    const place = found >= 0 ? found : cutting.calls.push({ written: call, canonical: form }) - 1
    return released(cutting, `a${String(place)}`, expr.at)
  }
  if (expr.kind === 'grouping') return refuse('block.shape', { what: 'GROUPING()' }, expr.at)
  if (expr.kind === 'column') return loneColumn(expr, form, cutting)
  if (expr.kind === 'sublink') {
    const test = expr.test === null ? null : rest(expr.test, cutting)
    const cut = cutting.inside(expr)
    return cut.kind === 'sublink' ? { ...cut, test, query: insideQuery(cut.query, cutting) } : cut
  }
  return mapExpr(expr, (child) => rest(child, cutting))
}

/** A column outside of any aggregate: a key by way of its table's primary key, or PostgreSQL's own complaint. */
function loneColumn(expr: Extract<Expr, { kind: 'column' }>, form: Expr, cutting: Cutting): Expr {
  if (expr.star) {
    const shown = expr.name.at(-1)
    const item = cutting.items.find((each) => each.table?.kind === 'private' && (shown === undefined || each.name === shown)) ?? cutting.items[0]
    return refuse('rows.private', { table: item?.table?.name ?? item?.name ?? '' }, expr.at)
  }
  const item = form.kind === 'column' ? cutting.items.find((each) => each.name === form.name[0]) : undefined
  if (item === undefined) return expr
  const primary = item.table?.kind === 'published' ? item.table.primaryKey : null
  const determined =
    primary !== null &&
    primary.every((column) => cutting.keys.some((key) => sameExpr(key.canonical, { kind: 'column', name: [item.name, column], star: false, at: -1 })))
  if (!determined) return refuse('block.ungrouped', { column: expr.name.join('.') }, expr.at)
  return released(cutting, `k${String(addKey(cutting, expr))}`, expr.at)
}

/** A subquery of the rest that speaks of the block's tables by name: its keys are released columns there too. */
function insideQuery(query: Query, cutting: Cutting): Query {
  const own =
    query.body.kind === 'select'
      ? new Set(
          query.body.from.flatMap((item) =>
            item.kind === 'table' ? [item.alias?.name ?? item.name.at(-1) ?? ''] : item.kind === 'join' ? [] : [item.alias?.name ?? ''],
          ),
        )
      : new Set<string>()
  const within = (e: Expr): Expr => {
    if (e.kind === 'column' && e.name.length > 1 && !own.has(e.name.at(-2) ?? '') && cutting.items.some((item) => item.name === e.name.at(-2)))
      return rest(e, cutting)
    return mapExpr(e, within, (q) => insideQuery(q, cutting))
  }
  return mapQuery(query, { expr: within, query: (q) => insideQuery(q, cutting) })
}

/** ORDER BY: a position or a label of the list stays as it is. */
function sorted(item: SortItem, select: Select, cutting: Cutting): SortItem {
  const by = item.by
  if (by.kind === 'constant') return item
  if (by.kind === 'column' && by.name.length === 1 && select.targets.some((target) => labelOf(target) === by.name[0])) return item
  return mapOrder([item], (e) => rest(e, cutting))[0] ?? item
}

function blockOf(select: Select, cutting: Cutting, names: Names): CutBlock {
  const targets = [...cutting.keys.map((key) => key.written), ...cutting.calls.map((call) => call.written)].map((value, i) => ({
    value,
    label: i < cutting.keys.length ? `k${String(i)}` : `a${String(i - cutting.keys.length)}`,
    at: -1,
  }))
  if (targets.length === 0) refuse('block.shape', { what: 'a SELECT without a key or an aggregate' })
  const bare = selectQuery({ targets, from: select.from, where: select.where, group: positions(cutting.keys.length) })
  const query: Query = { ...bare, with: commonFor(bare, names) }
  const { numbered, parameters } = renumber(query)
  return { query: numbered, parameters, names: shadowable(query, names) }
}

/** The common tables of rows that a block uses, in order, with those they use. */
function commonFor(query: Query, names: Names): Query['with'] {
  const used = new Set<string>()
  const follow = (q: Query): void => {
    for (const name of queryReads(q)) {
      const [bare] = name
      const rows = name.length === 1 && bare !== undefined && !used.has(bare) ? names.rows.get(bare) : undefined
      if (rows === undefined) continue
      used.add(rows.name)
      follow(rows.query)
    }
  }
  follow(query)
  const tables = [...names.rows.values()]
    .filter((rows) => used.has(rows.name))
    .map((rows): CommonTable => ({ name: rows.name, columns: rows.columns, materialized: 'default', query: rows.query, at: -1 }))
  return tables.length === 0 ? null : { recursive: false, tables }
}

/** Parameters numbered from 1 in the order in which they occur. */
function renumber(query: Query): { readonly numbered: Query; readonly parameters: readonly number[] } {
  const parameters: number[] = []
  const place = (number: number): number => {
    const found = parameters.indexOf(number)
    return (found >= 0 ? found : parameters.push(number) - 1) + 1
  }
  const expr = (e: Expr): Expr => (e.kind === 'parameter' ? { ...e, number: place(e.number) } : mapExpr(e, expr, inner))
  const inner = (q: Query): Query => mapQuery(q, { expr, query: inner })
  return { numbered: inner(query), parameters }
}

function shadowable(query: Query, names: Names): readonly string[] {
  const found = queryReads(query).filter((name) => name.length === 1 && !names.rows.has(name[0] ?? '') && findTable(names.dataSet, name) !== null)
  return [...new Set(found.map((name) => name[0] ?? ''))]
}
