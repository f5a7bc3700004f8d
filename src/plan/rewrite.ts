import { check } from '../base/check.ts'
import { call, cast, column, functionItem, hedgerowCall, selectQuery, target, text } from '../catalog/build.ts'
import { printQuery, printStatement } from '../sql/print.ts'
import { mapExpr } from '../sql/walk.ts'
import { mapQuery } from '../sql/walk-query.ts'
import type { ColumnDefinition, Expr, FromItem, Query, Statement, TypeRef } from '../sql/tree.ts'
import type { Cut, CutBlock } from './cut.ts'
import { placeholderName } from './cut-select.ts'

/** What the lobby said of a block: the types of its parameters and of its columns. */
export interface BlockTypes {
  readonly parameters: readonly TypeRef[]
  readonly columns: readonly ColumnDefinition[]
}

/** The block's own text, its parameters cast to what they were described as (not yet described: left open), so that it means the same wherever it is planned again. */
export function blockText(block: CutBlock, types: BlockTypes): string {
  const expr = (e: Expr): Expr => {
    if (e.kind !== 'parameter') return mapExpr(e, expr, inner)
    const type = types.parameters[e.number - 1]
    return type === undefined ? e : { kind: 'cast', arg: e, type, at: -1 }
  }
  const inner = (q: Query): Query => mapQuery(q, { expr, query: inner })
  return printQuery(inner(block.query))
}

/** The block's text before it is described: its parameters are of no type yet. */
export function openText(block: CutBlock): string {
  return blockText(block, { parameters: [], columns: [] })
}

/** The statement's text with a call of hedgerow.pull in place of each block; everything else is the analyst's own SQL over released rows. */
export function rewritten(cut: Cut, types: readonly BlockTypes[]): string {
  const texts = cut.blocks.map((block, i) => blockText(block, at(types, i)))
  const siblings = cast(text(JSON.stringify(texts)), 'jsonb')
  const pulls = cut.blocks.map((block, i) => pull(block, at(types, i), at(texts, i), siblings))
  const expr = (e: Expr): Expr => mapExpr(e, expr, query)
  const query = (q: Query): Query => {
    const mapped = mapQuery(q, { expr, query })
    return mapped.body.kind === 'select' ? { ...mapped, body: { ...mapped.body, from: mapped.body.from.map((item) => place(item, pulls)) } } : mapped
  }
  return printStatement(inStatement(cut.statement, query))
}

function at<T>(list: readonly T[], i: number): T {
  const item = list[i]
  check(item !== undefined, 'every block is described')
  return item
}

function inStatement(statement: Statement, query: (q: Query) => Query): Statement {
  switch (statement.kind) {
    case 'query':
    case 'select-into':
    case 'create-view':
    case 'insert':
    case 'declare-cursor':
    case 'copy-to-stdout':
      return { ...statement, query: query(statement.query) }
    case 'create-table-as':
    case 'prepare':
    case 'explain':
      return { ...statement, statement: inStatement(statement.statement, query) }
    case 'other':
      return statement
  }
}

function place(item: FromItem, pulls: readonly FromItem[]): FromItem {
  if (item.kind === 'join') return { ...item, left: place(item.left, pulls), right: place(item.right, pulls) }
  if (item.kind !== 'function') return item
  const made = item.functions[0]?.call
  if (made?.kind !== 'call' || made.name[0] !== 'hedgerow') return item
  const block = pulls.findIndex((_, i) => placeholderName(i) === made.name[1])
  const found = pulls[block]
  return found?.kind === 'function' ? { ...found, alias: item.alias } : item
}

/** pg_catalog.jsonb_to_recordset(hedgerow.pull(block, arguments, siblings, names)) with the described columns. */
function pull(block: CutBlock, types: BlockTypes, blockSql: string, siblings: Expr): FromItem {
  const args = block.parameters.map((number, i): Expr => ({ kind: 'cast', arg: { kind: 'parameter', number, at: -1 }, type: at(types.parameters, i), at: -1 }))
  const names: Expr = {
    kind: 'cast',
    arg: { kind: 'array', items: block.names.map(text), at: -1 },
    type: { name: ['pg_catalog', 'text'], modifiers: [], array: [-1], setof: false },
    at: -1,
  }
  const pulled: Expr = hedgerowCall('pull', [text(blockSql), call('jsonb_build_array', args), siblings, names])
  return functionItem(call('jsonb_to_recordset', [pulled]), null, types.columns)
}

/** A statement that fails in analysis, named by `marker`: the lobby's complaint about it is swapped for a refusal. */
export function refusedText(marker: string): string {
  return printQuery(selectQuery({ targets: [target(hedgerowCall(marker, []), '')], from: [] }))
}

/** EXPLAIN of a private statement: the lines come from Hedgerow, in PostgreSQL's own column. `parameters` are the types of the statement's, in order. */
export function explainText(statement: string, parameters: readonly TypeRef[]): string {
  const args = parameters.map((type, i): Expr => ({ kind: 'cast', arg: { kind: 'parameter', number: i + 1, at: -1 }, type, at: -1 }))
  const lines = functionItem(hedgerowCall('explain', [text(statement), call('jsonb_build_array', args)]), { name: 'plan', columns: ['QUERY PLAN'] })
  return printQuery(selectQuery({ targets: [target(column('plan', 'QUERY PLAN'), 'QUERY PLAN')], from: [lines] }))
}
