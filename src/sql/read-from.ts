import type { RawNode } from './raw.ts'
import { readAlias, readTypeField } from './read-parts.ts'
import type { Reader } from './read-port.ts'
import type { ColumnDefinition, Expr, FromItem, Name, Query } from './tree.ts'

/** One item of a FROM list. */
export function readFrom(node: RawNode, reader: Reader): FromItem {
  switch (node.tag) {
    case 'RangeVar':
      return readTable(node)
    case 'RangeSubselect':
      return readSubquery(node, reader)
    case 'RangeFunction':
      return readFunction(node, reader)
    case 'JoinExpr':
      return readJoin(node, reader)
    default:
      return node.refuse()
  }
}

/** The qualified name of a RangeVar, whose other fields stay to be read. */
export function readTableName(node: RawNode): Name {
  const name = [node.text('catalogname'), node.text('schemaname'), node.text('relname')]
  return name.filter((part) => part !== '')
}

function readTable(node: RawNode): FromItem {
  node.only('relpersistence', 'p')
  const item: FromItem = { kind: 'table', name: readTableName(node), only: !node.flag('inh'), alias: readAlias(node, 'alias'), at: node.at }
  node.done()
  return item
}

function readSubquery(node: RawNode, reader: Reader): FromItem {
  const query = reader.query(node.need('subquery'))
  const item: FromItem = { kind: 'subquery', query, lateral: node.flag('lateral'), alias: readAlias(node, 'alias'), at: placeOf(query, node.at) }
  node.done()
  return item
}

/** A subquery has no place of its own in the parser's tree: it stands where its first expression stands. */
function placeOf(query: Query, above: number): number {
  const body = query.body
  if (body.kind === 'set-operation') return placeOf(body.left, above)
  const first = body.kind === 'select' ? body.targets[0]?.at : body.rows[0]?.[0]?.at
  return first !== undefined && first >= 0 ? first : above
}

function readFunction(node: RawNode, reader: Reader): FromItem {
  const functions = node.nodes('functions').map((item) => {
    if (item.tag !== 'List') return item.refuse()
    const [call, definitions, ...more] = item.maybeNodes('items')
    item.done()
    if (call === undefined || call === null || more.length > 0) return item.refuse()
    return { call: reader.expr(call), definitions: definitions ? readDefinitionList(definitions, reader) : [] }
  })
  const at = functions[0]?.call.at ?? node.at
  const item: FromItem = {
    kind: 'function',
    functions,
    rowsFrom: node.flag('is_rowsfrom'),
    lateral: node.flag('lateral'),
    ordinality: node.flag('ordinality'),
    alias: readAlias(node, 'alias'),
    definitions: node.nodes('coldeflist').map((definition) => readDefinition(definition, reader)),
    at,
  }
  node.done()
  return item
}

function readDefinitionList(node: RawNode, reader: Reader): readonly ColumnDefinition[] {
  if (node.tag !== 'List') return node.refuse()
  const definitions = node.nodes('items').map((item) => readDefinition(item, reader))
  node.done()
  return definitions
}

function readDefinition(node: RawNode, reader: Reader): ColumnDefinition {
  if (node.tag !== 'ColumnDef') return node.refuse()
  node.only('is_local', true)
  const definition = { name: node.text('colname'), type: readTypeField(node, 'typeName', reader) }
  node.done()
  return definition
}

const joinTypes = { JOIN_INNER: 'inner', JOIN_LEFT: 'left', JOIN_RIGHT: 'right', JOIN_FULL: 'full' } as const

function readJoin(node: RawNode, reader: Reader): FromItem {
  const left = readFrom(node.need('larg'), reader)
  const right = readFrom(node.need('rarg'), reader)
  const on = node.node('quals')
  const condition: Expr | null = on && reader.expr(on)
  const item: FromItem = {
    kind: 'join',
    type: node.choice('jointype', joinTypes),
    natural: node.flag('isNatural'),
    left,
    right,
    using: node.strings('usingClause'),
    usingAlias: readAlias(node, 'join_using_alias'),
    on: condition,
    alias: readAlias(node, 'alias'),
    at: left.at,
  }
  node.done()
  return item
}
