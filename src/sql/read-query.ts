import type { RawNode } from './raw.ts'
import { readFrom } from './read-from.ts'
import { readOrder, readWindow } from './read-parts.ts'
import type { Reader } from './read-port.ts'
import type { CommonTable, Expr, GroupItem, Query, Select, SetOperation, Target, Values } from './tree.ts'

/** SelectStmt without INTO: an INTO that nobody took refuses the statement. */
export function readQuery(node: RawNode, reader: Reader): Query {
  if (node.tag !== 'SelectStmt') return node.refuse()
  const limit = node.node('limitCount')
  const offset = node.node('limitOffset')
  const option = node.choice('limitOption', { LIMIT_OPTION_DEFAULT: 'default', LIMIT_OPTION_COUNT: 'count', LIMIT_OPTION_WITH_TIES: 'ties' } as const)
  const query: Query = {
    kind: 'query',
    with: readWith(node, reader),
    body: readBody(node, reader),
    order: readOrder(node, 'sortClause', reader),
    limit: limit && reader.expr(limit),
    offset: offset && reader.expr(offset),
    withTies: option === 'ties',
  }
  node.done()
  return query
}

const setWords = { SETOP_NONE: 'none', SETOP_UNION: 'union', SETOP_INTERSECT: 'intersect', SETOP_EXCEPT: 'except' } as const

function readBody(node: RawNode, reader: Reader): Select | SetOperation | Values {
  const word = node.choice('op', setWords)
  if (word !== 'none') {
    const left = node.part('larg', 'SelectStmt') ?? node.refuse('larg')
    const right = node.part('rarg', 'SelectStmt') ?? node.refuse('rarg')
    return { kind: 'set-operation', word, all: node.flag('all'), left: reader.query(left), right: reader.query(right) }
  }
  if (node.has('valuesLists')) {
    return { kind: 'values', rows: node.nodes('valuesLists').map((row) => readRow(row, reader)) }
  }
  const where = node.node('whereClause')
  const having = node.node('havingClause')
  return {
    kind: 'select',
    distinct: readDistinct(node, reader),
    targets: node.nodes('targetList').map((item) => readTarget(item, reader)),
    from: node.nodes('fromClause').map((item) => readFrom(item, reader)),
    where: where && reader.expr(where),
    group: node.nodes('groupClause').map((item) => readGroup(item, reader)),
    groupDistinct: node.flag('groupDistinct'),
    having: having && reader.expr(having),
    windows: node.nodes('windowClause').map((item) => (item.tag === 'WindowDef' ? readWindow(item, reader) : item.refuse())),
  }
}

function readRow(row: RawNode, reader: Reader): readonly Expr[] {
  if (row.tag !== 'List') return row.refuse()
  const items = row.nodes('items').map((item) => reader.expr(item))
  row.done()
  return items
}

/** The parser writes plain DISTINCT as a list of one absent node. */
function readDistinct(node: RawNode, reader: Reader): readonly Expr[] | null {
  if (!node.has('distinctClause')) return null
  const items = node.maybeNodes('distinctClause')
  if (items.length === 1 && items[0] === null) return []
  return items.map((item) => (item === null ? node.refuse('distinctClause') : reader.expr(item)))
}

function readTarget(item: RawNode, reader: Reader): Target {
  if (item.tag !== 'ResTarget') return item.refuse()
  const target: Target = { value: reader.expr(item.need('val')), label: item.text('name'), at: item.at }
  item.done()
  return target
}

const groupWords = { GROUPING_SET_EMPTY: 'empty', GROUPING_SET_SETS: 'grouping sets', GROUPING_SET_ROLLUP: 'rollup', GROUPING_SET_CUBE: 'cube' } as const

function readGroup(item: RawNode, reader: Reader): GroupItem {
  if (item.tag !== 'GroupingSet') return { kind: 'expression', value: reader.expr(item) }
  const word = item.choice('kind', groupWords)
  const items = item.nodes('content').map((inner) => readGroup(inner, reader))
  item.done()
  if (word === 'empty') return items.length === 0 ? { kind: 'empty', at: item.at } : item.refuse()
  return { kind: 'sets', word, items, at: item.at }
}

function readWith(node: RawNode, reader: Reader): Query['with'] {
  const clause = node.part('withClause', 'WithClause')
  if (clause === null) return null
  const tables = clause.nodes('ctes').map((table) => readCommonTable(table, reader))
  const recursive = clause.flag('recursive')
  clause.done()
  return { recursive, tables }
}

const materialized = { CTEMaterializeDefault: 'default', CTEMaterializeAlways: 'always', CTEMaterializeNever: 'never' } as const

function readCommonTable(node: RawNode, reader: Reader): CommonTable {
  if (node.tag !== 'CommonTableExpr') return node.refuse()
  const inner = node.need('ctequery')
  if (inner.tag !== 'SelectStmt') return node.refuse('ctequery')
  const table: CommonTable = {
    name: node.text('ctename'),
    columns: node.strings('aliascolnames'),
    materialized: node.choice('ctematerialized', materialized),
    query: reader.query(inner),
    at: node.at,
  }
  node.done()
  return table
}
