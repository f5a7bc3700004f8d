import { unreachable } from '../base/check.ts'
import type { FromItem, GroupItem, Query, Expr, Select, Statement } from './tree.ts'
import { eachExpr, mapOrder, mapType, mapWindow } from './walk.ts'

/** What is done to the direct parts of a query. */
export interface QueryParts {
  /** Done to every expression that stands in the query itself: targets, conditions, keys, orders, limits, rows, calls in FROM. */
  readonly expr: (e: Expr) => Expr
  /** Done to every query that stands in it: common tables, operands of a set operation, subqueries in FROM. Those of sublinks are the expressions' affair. */
  readonly query: (q: Query) => Query
}

/** Rebuilds a query with `parts` done to each direct part, common tables first, then the body, then order and limits. */
export function mapQuery(q: Query, parts: QueryParts): Query {
  const tables = q.with?.tables.map((table) => ({ ...table, query: parts.query(table.query) }))
  return {
    kind: 'query',
    with: q.with && { recursive: q.with.recursive, tables: tables ?? [] },
    body: mapBody(q.body, parts),
    order: mapOrder(q.order, parts.expr),
    limit: q.limit && parts.expr(q.limit),
    offset: q.offset && parts.expr(q.offset),
    withTies: q.withTies,
  } satisfies Query
}

function mapBody(body: Query['body'], parts: QueryParts): Query['body'] {
  switch (body.kind) {
    case 'select':
      return mapSelect(body, parts)
    case 'set-operation':
      return { kind: 'set-operation', word: body.word, all: body.all, left: parts.query(body.left), right: parts.query(body.right) }
    case 'values':
      return { kind: 'values', rows: body.rows.map((row) => row.map(parts.expr)) }
    default:
      return unreachable(body)
  }
}

function mapSelect(select: Select, parts: QueryParts): Select {
  return {
    kind: 'select',
    distinct: select.distinct && select.distinct.map(parts.expr),
    targets: select.targets.map((target) => ({ value: parts.expr(target.value), label: target.label, at: target.at })),
    from: select.from.map((item) => mapFrom(item, parts)),
    where: select.where && parts.expr(select.where),
    group: select.group.map((item) => mapGroup(item, parts.expr)),
    groupDistinct: select.groupDistinct,
    having: select.having && parts.expr(select.having),
    windows: select.windows.map((window) => mapWindow(window, parts.expr)),
  } satisfies Select
}

function mapGroup(item: GroupItem, f: QueryParts['expr']): GroupItem {
  switch (item.kind) {
    case 'expression':
      return { kind: 'expression', value: f(item.value) }
    case 'empty':
      return item
    case 'sets':
      return { kind: 'sets', word: item.word, items: item.items.map((inner) => mapGroup(inner, f)), at: item.at }
    default:
      return unreachable(item)
  }
}

/** Rebuilds an item of FROM with `parts` done to each expression and query in it; a join is walked through, left first. */
export function mapFrom(item: FromItem, parts: QueryParts): FromItem {
  switch (item.kind) {
    case 'table':
      return item
    case 'subquery':
      return { kind: 'subquery', query: parts.query(item.query), lateral: item.lateral, alias: item.alias, at: item.at }
    case 'function':
      return {
        kind: 'function',
        functions: item.functions.map(({ call, definitions }) => ({
          call: parts.expr(call),
          definitions: definitions.map((column) => ({ name: column.name, type: mapType(column.type, parts.expr) })),
        })),
        rowsFrom: item.rowsFrom,
        lateral: item.lateral,
        ordinality: item.ordinality,
        alias: item.alias,
        definitions: item.definitions.map((column) => ({ name: column.name, type: mapType(column.type, parts.expr) })),
        at: item.at,
      } satisfies FromItem
    case 'join':
      return {
        kind: 'join',
        type: item.type,
        natural: item.natural,
        left: mapFrom(item.left, parts),
        right: mapFrom(item.right, parts),
        using: item.using,
        usingAlias: item.usingAlias,
        on: item.on && parts.expr(item.on),
        alias: item.alias,
        at: item.at,
      } satisfies FromItem
    default:
      return unreachable(item)
  }
}

/** The direct parts of a query: its own expressions, and the queries that stand in it outside of expressions. */
export function partsOf(q: Query): { readonly exprs: readonly Expr[]; readonly queries: readonly Query[] } {
  const exprs: Expr[] = []
  const queries: Query[] = []
  mapQuery(q, {
    expr: (e) => {
      exprs.push(e)
      return e
    },
    query: (inner) => {
      queries.push(inner)
      return inner
    },
  })
  return { exprs, queries }
}

/** Visits a query and every query inside it, at any depth, parents first: common tables, operands, subqueries in FROM, and the queries of sublinks. */
export function eachQuery(q: Query, visit: (q: Query) => void): void {
  visit(q)
  const { exprs, queries } = partsOf(q)
  for (const inner of queries) eachQuery(inner, visit)
  for (const expr of exprs) {
    eachExpr(expr, (e) => {
      if (e.kind === 'sublink') eachQuery(e.query, visit)
    })
  }
}

/** The query of a statement; null where there is none. */
export function queryOf(statement: Statement): Query | null {
  switch (statement.kind) {
    case 'query':
    case 'select-into':
    case 'create-view':
    case 'insert':
    case 'declare-cursor':
    case 'copy-to-stdout':
      return statement.query
    case 'create-table-as':
    case 'prepare':
    case 'explain':
      return queryOf(statement.statement)
    case 'other':
      return null
    default:
      return unreachable(statement)
  }
}
