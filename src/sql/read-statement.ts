import { isFields, RawNode } from './raw.ts'
import type { RawFields } from './raw.ts'
import { readTableName } from './read-from.ts'
import { readAlias, readType } from './read-parts.ts'
import type { Reader } from './read-port.ts'
import type { Constant, IntoTable, Option, Query, Statement } from './tree.ts'

type Read = (node: RawNode, reader: Reader) => Statement

/** Reads a statement node. A kind that is none of the tree's is 'other'; a form that the tree cannot hold in full refuses. */
export function readStatement(node: RawNode, reader: Reader): Statement {
  const read = Object.hasOwn(readers, node.tag) ? readers[node.tag] : undefined
  return read === undefined ? other(node) : read(node, reader)
}

function other(node: RawNode): Statement {
  return { kind: 'other', tag: node.tag }
}

function done(node: RawNode, statement: Statement): Statement {
  node.done()
  return statement
}

const onCommit = { ONCOMMIT_NOOP: 'default', ONCOMMIT_PRESERVE_ROWS: 'preserve', ONCOMMIT_DELETE_ROWS: 'delete', ONCOMMIT_DROP: 'drop' } as const
const persistence = { p: 'permanent', t: 'temporary', u: 'unlogged' } as const

function readInto(node: RawNode): { readonly into: IntoTable; readonly withData: boolean } {
  const table = node.part('rel', 'RangeVar') ?? node.refuse()
  table.only('inh', true)
  const into: IntoTable = {
    name: readTableName(table),
    columns: node.strings('colNames'),
    persistence: table.choice('relpersistence', persistence),
    onCommit: node.choice('onCommit', onCommit),
  }
  const withData = !node.flag('skipData')
  table.done()
  node.done()
  return { into, withData }
}

/** The INTO of a set operation stands in its leftmost SELECT: finds it, and gives the fields without it. */
function splitInto(fields: RawFields): { readonly into: RawFields | null; readonly rest: RawFields } {
  const { intoClause, ...rest } = fields
  if (isFields(intoClause)) return { into: intoClause, rest }
  const larg = fields['larg']
  if (!isFields(larg)) return { into: null, rest: fields }
  const left = splitInto(larg)
  return left.into === null ? { into: null, rest: fields } : { into: left.into, rest: { ...fields, larg: left.rest } }
}

const readSelect: Read = (node, reader) => {
  const { into, rest } = splitInto(node.raw)
  const query = reader.query(new RawNode('SelectStmt', rest, node.at))
  if (into === null) return { kind: 'query', query }
  return { kind: 'select-into', into: readInto(new RawNode('IntoClause', into, node.at)).into, query }
}

function readOptions(node: RawNode): readonly Option[] {
  return node.nodes('options').map((item) => {
    if (item.tag !== 'DefElem') return item.refuse()
    item.only('defaction', 'DEFELEM_UNSPEC')
    const name = item.text('defname')
    const value = item.node('arg')
    item.done()
    return { name, value: value && readOptionValue(value) }
  })
}

/** A value outside of expressions: the constant it would be inside. */
function readOptionValue(node: RawNode): Constant {
  const value = optionConstant(node)
  node.done()
  return value
}

function optionConstant(node: RawNode): Constant {
  switch (node.tag) {
    case 'Integer': {
      const value = node.number('ival')
      return value < 0 ? node.refuse() : { kind: 'integer', value: String(value) }
    }
    case 'Float': {
      const value = node.text('fval')
      return value.startsWith('-') ? node.refuse() : { kind: 'decimal', value }
    }
    case 'String':
      return { kind: 'string', value: node.text('sval') }
    case 'Boolean':
      return { kind: 'boolean', value: node.flag('boolval') }
    default:
      return node.refuse()
  }
}

/** Reads a statement inside another one; null where only its tag is known. */
function readInner(node: RawNode, reader: Reader): Statement | null {
  const inner = readStatement(node.need('query'), reader)
  return inner.kind === 'other' ? null : inner
}

/** Reads a query inside another statement; null where a command stands there. */
function readInnerQuery(node: RawNode, field: string, reader: Reader): Query | null {
  const inner = node.node(field)
  return inner?.tag === 'SelectStmt' ? reader.query(inner) : null
}

const readCreateTableAs: Read = (node, reader) => {
  const statement = readInner(node, reader)
  if (statement === null || node.text('objtype') !== 'OBJECT_TABLE') return other(node)
  const { into, withData } = readInto(node.part('into', 'IntoClause') ?? node.refuse())
  return done(node, { kind: 'create-table-as', into, statement, ifNotExists: node.flag('if_not_exists'), withData })
}

const readView: Read = (node, reader) => {
  const table = node.part('view', 'RangeVar') ?? node.refuse()
  table.only('inh', true)
  const temporary = table.choice('relpersistence', { p: false, t: true })
  const name = readTableName(table)
  table.done()
  node.only('withCheckOption', 'NO_CHECK_OPTION')
  return done(node, {
    kind: 'create-view',
    name,
    columns: node.strings('aliases'),
    replace: node.flag('replace'),
    temporary,
    options: readOptions(node),
    query: reader.query(node.need('query')),
  })
}

const readInsert: Read = (node, reader) => {
  const query = readInnerQuery(node, 'selectStmt', reader)
  if (query === null) return other(node)
  const table = node.part('relation', 'RangeVar') ?? node.refuse()
  table.only('inh', true)
  table.only('relpersistence', 'p')
  const alias = readAlias(table, 'alias')
  const name = readTableName(table)
  table.done()
  node.only('override', 'OVERRIDING_NOT_SET')
  const columns = node.nodes('cols').map((item) => {
    if (item.tag !== 'ResTarget') return item.refuse()
    const column = item.text('name')
    item.done()
    return column
  })
  return done(node, { kind: 'insert', table: name, alias: alias?.name ?? '', columns, query })
}

const readCursor: Read = (node, reader) => {
  const query = readInnerQuery(node, 'query', reader)
  if (query === null) return other(node)
  return done(node, { kind: 'declare-cursor', name: node.text('portalname'), options: node.number('options'), query })
}

/** COPY to a file or a program, and COPY of a table, are other statements. */
const readCopy: Read = (node, reader) => {
  if (node.has('filename') || node.has('relation')) return other(node)
  const query = readInnerQuery(node, 'query', reader)
  if (query === null) return other(node)
  return done(node, { kind: 'copy-to-stdout', query, options: readOptions(node) })
}

const readPrepare: Read = (node, reader) => {
  const statement = readInner(node, reader)
  if (statement === null) return other(node)
  const types = node.nodes('argtypes').map((item) => (item.tag === 'TypeName' ? readType(item, reader) : item.refuse()))
  return done(node, { kind: 'prepare', name: node.text('name'), types, statement })
}

const readExplain: Read = (node, reader) => {
  const statement = readInner(node, reader)
  if (statement === null) return other(node)
  return done(node, { kind: 'explain', options: readOptions(node), statement })
}

const readers: Readonly<Record<string, Read>> = {
  SelectStmt: readSelect,
  CreateTableAsStmt: readCreateTableAs,
  ViewStmt: readView,
  InsertStmt: readInsert,
  DeclareCursorStmt: readCursor,
  CopyStmt: readCopy,
  PrepareStmt: readPrepare,
  ExplainStmt: readExplain,
}
