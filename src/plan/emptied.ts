import { constant, nothing, selectQuery, target } from '../catalog/build.ts'
import { mapExpr } from '../sql/walk.ts'
import { mapQuery } from '../sql/walk-query.ts'
import type { DataColumn } from '../policy/data-set.ts'
import type { Expr, FromItem, Query, TypeRef } from '../sql/tree.ts'
import { findTable } from './names.ts'
import type { Names } from './rows-level.ts'

/** Whether a condition is false by its own text: FALSE, 1 = 0, and a conjunction that holds one. */
export function isNeverTrue(test: Expr | null): boolean {
  if (test === null) return false
  switch (test.kind) {
    case 'constant':
      return test.constant.kind === 'null' || (test.constant.kind === 'boolean' && !test.constant.value)
    case 'logic':
      return test.word === 'and' ? test.args.some(isNeverTrue) : test.args.every(isNeverTrue)
    case 'operator': {
      const [left, right] = [integerOf(test.left), integerOf(test.right)]
      if (left === null || right === null) return false
      const sign = test.name.at(-1)
      return (sign === '=' && left !== right) || ((sign === '<>' || sign === '!=') && left === right)
    }
    default:
      return false
  }
}

function integerOf(expr: Expr | null): bigint | null {
  return expr?.kind === 'constant' && expr.constant.kind === 'integer' ? BigInt(expr.constant.value) : null
}

/** Whether a LIMIT is the constant 0. */
export function isZero(limit: Expr | null): boolean {
  return integerOf(limit) === 0n
}

/** The query with every private table in it replaced by no rows of the same columns: PostgreSQL then answers by itself, typed, and nothing is asked or charged. */
export function emptied(query: Query, names: Names): Query {
  const inQuery = (q: Query): Query => {
    const mapped = mapQuery(q, { expr: inExpr, query: inQuery })
    return mapped.body.kind === 'select' ? { ...mapped, body: { ...mapped.body, from: mapped.body.from.map(inFrom) } } : mapped
  }
  const inExpr = (e: Expr): Expr => mapExpr(e, inExpr, inQuery)
  const inFrom = (item: FromItem): FromItem => {
    if (item.kind === 'join') return { ...item, left: inFrom(item.left), right: inFrom(item.right) }
    if (item.kind !== 'table') return item
    const table = findTable(names.dataSet, item.name)
    if (table?.kind !== 'private') return item
    return {
      kind: 'subquery',
      query: noRows([...table.columns.values()]),
      lateral: false,
      alias: { name: item.alias?.name ?? table.name, columns: item.alias?.columns ?? [] },
      at: item.at,
    }
  }
  return inQuery(query)
}

function noRows(columns: readonly DataColumn[]): Query {
  const targets = columns.map((column) => target({ kind: 'cast', arg: nothing(), type: typeOf(column), at: -1 }, column.name))
  return selectQuery({ targets, from: [], where: constant({ kind: 'boolean', value: false }) })
}

function typeOf(column: DataColumn): TypeRef {
  const modifiers = /\((\d+)(?:,(\d+))?\)/.exec(column.type.printed)
  const numbers = (modifiers?.slice(1) ?? []).filter((text) => text !== undefined)
  return {
    name: [column.type.schema, column.type.name],
    modifiers: numbers.map((value) => ({ kind: 'constant', constant: { kind: 'integer', value }, at: -1 })),
    array: [],
    setof: false,
  }
}
