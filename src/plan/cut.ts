import { positions } from '../catalog/build.ts'
import { unreachable } from '../base/check.ts'
import { refuse, withFacts } from '../base/refusal.ts'
import type { DataSet } from '../policy/data-set.ts'
import { mapExpr } from '../sql/walk.ts'
import { mapQuery } from '../sql/walk-query.ts'
import type { CommonTable, Expr, FromItem, Query, Select, Statement } from '../sql/tree.ts'
import { containsWindow } from './contains.ts'
import { cutSelect } from './cut-select.ts'
import { emptied, isNeverTrue, isZero } from './emptied.ts'
import { exampleFor, firstPrivate } from './example.ts'
import { findTable } from './names.ts'
import { aggregates, type Names, readsRows, withNames, yieldsRows } from './rows-level.ts'

/** A block as it was cut out of a statement. */
export interface CutBlock {
  /** Its own SELECT: keys, then aggregate calls, grouped by position; parameters numbered from 1. */
  readonly query: Query
  /** The statement's parameter behind each of the block's. */
  readonly parameters: readonly number[]
  /** Private tables it names without a schema. */
  readonly names: readonly string[]
}

export interface Cut {
  /** The statement with a call of `hedgerow."block N"()` where block N (from 0) stood; see `rewrite.ts`. */
  readonly statement: Statement
  readonly blocks: readonly CutBlock[]
}

/** Cuts the blocks out of a statement that names private tables; what is left is post-processing. Refuses what would show rows. */
export function cutStatement(statement: Statement, dataSet: DataSet): Cut {
  const blocks: CutBlock[] = []
  const names: Names = { dataSet, rows: new Map(), finished: new Set() }
  const cut = (query: Query): Query =>
    withFacts(
      () => ({ example: exampleFor(dataSet, query), person: dataSet.personCalled }),
      () => cutQuery(query, names, blocks),
    )
  return { statement: mapStatement(statement, cut, dataSet), blocks }
}

function mapStatement(statement: Statement, cut: (query: Query) => Query, dataSet: DataSet): Statement {
  switch (statement.kind) {
    case 'query':
    case 'declare-cursor':
    case 'copy-to-stdout':
      return { ...statement, query: cut(statement.query) }
    case 'select-into':
      return { ...statement, into: notShadowing(statement.into, dataSet), query: cut(statement.query) }
    case 'create-view':
      notShadowing(statement, dataSet)
      return { ...statement, query: cut(statement.query) }
    case 'insert':
      if (isPrivateName(statement.table, dataSet))
        refuse('rows.locked', { what: 'INSERT', table: statement.table.join('.'), example: exampleFor(dataSet, null) })
      return { ...statement, query: cut(statement.query) }
    case 'create-table-as':
      return { ...statement, into: notShadowing(statement.into, dataSet), statement: mapStatement(statement.statement, cut, dataSet) }
    case 'prepare':
    case 'explain':
      return { ...statement, statement: mapStatement(statement.statement, cut, dataSet) }
    case 'other':
      return statement
    default:
      return unreachable(statement)
  }
}

function isPrivateName(name: readonly string[], dataSet: DataSet): boolean {
  return findTable(dataSet, name)?.kind === 'private'
}

function notShadowing<T extends { readonly name: readonly string[] }>(into: T, dataSet: DataSet): T {
  if (isPrivateName(into.name.slice(-1), dataSet)) refuse('rows.shadow', { table: into.name.at(-1) ?? '', example: exampleFor(dataSet, null) })
  return into
}

/** Cuts blocks out of a query and everything in it. */
export function cutQuery(query: Query, names: Names, blocks: CutBlock[]): Query {
  if (isZero(query.limit)) return emptied(query, names)
  const inner = withNames(query, names)
  const tables = (query.with?.tables ?? []).flatMap((table): readonly CommonTable[] => {
    const seen = withNames({ ...query, with: before(query, table) }, names)
    if (yieldsRows(table.query, seen)) return []
    return [{ ...table, query: cutQuery(table.query, query.with?.recursive === true ? inner : seen, blocks) }]
  })
  const kept = query.with === null || tables.length === 0 ? null : { ...query.with, tables }
  const outer: Query = { ...query, with: kept }
  const inside = (q: Query): Query => cutQuery(q, inner, blocks)
  const expr = (e: Expr): Expr => mapExpr(e, expr, inside)
  const body = query.body
  if (body.kind !== 'select') {
    if (body.kind === 'set-operation') for (const side of [body.left, body.right]) if (yieldsRows(side, inner)) showsRows(side, inner)
    return { ...mapQuery({ ...outer, with: null }, { expr, query: inside }), with: kept }
  }
  if (!body.from.some((item) => readsRows(item, inner))) return { ...mapQuery({ ...outer, with: null }, { expr, query: inside }), with: kept }
  if (isNeverTrue(body.where)) return emptied(query, names)
  const grouped = distinctAsGroups(body, query)
  if (
    !aggregates(
      grouped,
      query.order.map((item) => item.by),
    )
  )
    return showsRows(query, inner)
  return cutSelect({ ...outer, body: grouped }, grouped, inner, blocks, expr)
}

function before(query: Query, table: CommonTable): Query['with'] {
  if (query.with === null) return null
  const at = query.with.tables.indexOf(table)
  return { ...query.with, tables: query.with.tables.slice(0, at) }
}

/** SELECT DISTINCT of columns is a list of groups. */
function distinctAsGroups(select: Select, query: Query): Select {
  if (
    select.distinct === null ||
    select.distinct.length > 0 ||
    aggregates(
      select,
      query.order.map((item) => item.by),
    )
  )
    return select
  if (select.targets.some((target) => containsWindow(target.value) || (target.value.kind === 'column' && target.value.star))) return select
  return {
    ...select,
    distinct: null,
    group: positions(select.targets.length),
  }
}

/** The refusal of rows, at the table that holds them. */
function showsRows(query: Query, names: Names): never {
  const body = query.body
  const table = firstPrivate(names.dataSet, query)?.name ?? [...names.rows.keys()][0] ?? ''
  const at = body.kind === 'select' ? placeOf(body.from) : -1
  const example = exampleFor(names.dataSet, query)
  if (body.kind === 'select' && body.targets.some((target) => containsWindow(target.value))) {
    return refuse('rows.window', { table, example: `SELECT answer.*, sum(answer.count) OVER () FROM (${example}) AS answer` }, at)
  }
  return refuse('rows.private', { table, example }, at)
}

function placeOf(items: readonly FromItem[]): number {
  const [first] = items
  return first === undefined ? -1 : first.at
}
