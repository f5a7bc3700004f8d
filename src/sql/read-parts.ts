import type { RawNode } from './raw.ts'
import type { Reader } from './read-port.ts'
import type { Alias, Constant, Expr, Name, SortItem, TypeRef, Window } from './tree.ts'

/** A_Const, or its negative, which the parser folds into the constant: the tree keeps the sign as an operator. */
export function readConstant(node: RawNode): Expr {
  const at = node.at
  const constant = constantOf(node)
  node.done()
  const signed = constant.kind === 'integer' || constant.kind === 'decimal' ? constant.value.startsWith('-') : false
  if (!signed || !('value' in constant) || typeof constant.value !== 'string') return { kind: 'constant', constant, at }
  const right: Expr = { kind: 'constant', constant: { ...constant, value: constant.value.slice(1) } as Constant, at }
  return { kind: 'operator', name: ['-'], left: null, right, at }
}

function constantOf(node: RawNode): Constant {
  if (node.flag('isnull')) return { kind: 'null' }
  const integer = node.part('ival', 'Integer')
  if (integer !== null) return { kind: 'integer', value: String(whole(integer)) }
  const decimal = node.part('fval', 'Float')
  if (decimal !== null) return { kind: 'decimal', value: inside(decimal, 'fval') }
  const text = node.part('sval', 'String')
  if (text !== null) return { kind: 'string', value: inside(text, 'sval') }
  const bits = node.part('bsval', 'BitString')
  if (bits !== null) return { kind: 'bits', value: inside(bits, 'bsval') }
  const truth = node.part('boolval', 'Boolean')
  if (truth === null) return node.refuse()
  const value = truth.flag('boolval')
  truth.done()
  return { kind: 'boolean', value }
}

function inside(node: RawNode, field: string): string {
  const value = node.text(field)
  node.done()
  return value
}

/** An Integer node's value. */
export function whole(node: RawNode): number {
  const value = node.number('ival')
  node.done()
  return value
}

/** A name from a list of String nodes; never empty. */
export function readName(node: RawNode, field: string): Name {
  const name = node.strings(field)
  return name.length === 0 ? node.refuse(field) : name
}

/** TypeName. */
export function readType(node: RawNode, reader: Reader): TypeRef {
  node.only('typemod', -1)
  const type: TypeRef = {
    name: readName(node, 'names'),
    modifiers: node.nodes('typmods').map((item) => reader.expr(item)),
    array: node.nodes('arrayBounds').map((item) => (item.tag === 'Integer' ? whole(item) : node.refuse())),
    setof: node.flag('setof'),
  }
  node.done()
  return type
}

/** A field that holds a TypeName. */
export function readTypeField(node: RawNode, field: string, reader: Reader): TypeRef {
  const type = node.part(field, 'TypeName')
  return type === null ? node.refuse(field) : readType(type, reader)
}

/** A field that holds an Alias, or nothing. */
export function readAlias(node: RawNode, field: string): Alias | null {
  const alias = node.part(field, 'Alias')
  if (alias === null) return null
  const name = alias.text('aliasname')
  const columns = alias.strings('colnames')
  alias.done()
  return { name, columns }
}

const directions = { SORTBY_DEFAULT: 'default', SORTBY_ASC: 'asc', SORTBY_DESC: 'desc', SORTBY_USING: 'using' } as const
const nullOrders = { SORTBY_NULLS_DEFAULT: 'default', SORTBY_NULLS_FIRST: 'first', SORTBY_NULLS_LAST: 'last' } as const

/** A list of SortBy nodes. */
export function readOrder(node: RawNode, field: string, reader: Reader): readonly SortItem[] {
  return node.nodes(field).map((item) => {
    if (item.tag !== 'SortBy') return item.refuse()
    const sort: SortItem = {
      by: reader.expr(item.need('node')),
      direction: item.choice('sortby_dir', directions),
      using: item.strings('useOp'),
      nulls: item.choice('sortby_nulls', nullOrders),
    }
    item.done()
    return sort
  })
}

/** WindowDef, from a WINDOW clause or from OVER. */
export function readWindow(node: RawNode, reader: Reader): Window {
  const start = node.node('startOffset')
  const end = node.node('endOffset')
  const window: Window = {
    name: node.text('name'),
    refers: node.text('refname'),
    partition: node.nodes('partitionClause').map((item) => reader.expr(item)),
    order: readOrder(node, 'orderClause', reader),
    frame: { options: node.number('frameOptions'), start: start && reader.expr(start), end: end && reader.expr(end) },
  }
  node.done()
  return window
}
