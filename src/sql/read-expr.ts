import type { RawNode } from './raw.ts'
import { readCall } from './read-call.ts'
import { readOperator } from './read-operator.ts'
import { readConstant, readName, readTypeField } from './read-parts.ts'
import type { Reader } from './read-port.ts'
import type { Expr, Name, Subscript } from './tree.ts'

type Read = (node: RawNode, reader: Reader) => Expr

/** Reads any expression node; a kind that is not in the table refuses the statement. */
export function readExpr(node: RawNode, reader: Reader): Expr {
  const read = Object.hasOwn(readers, node.tag) ? readers[node.tag] : undefined
  return read === undefined ? node.refuse() : read(node, reader)
}

function each(node: RawNode, field: string, reader: Reader): readonly Expr[] {
  return node.nodes(field).map((item) => reader.expr(item))
}

/** Ends the reading of `node`, whose tree is `expr`. */
function read(node: RawNode, expr: Expr): Expr {
  node.done()
  return expr
}

const readColumn: Read = (node) => {
  const fields = node.nodes('fields')
  const last = fields.at(-1)
  const star = last?.tag === 'A_Star'
  if (star) last.done()
  const name = (star ? fields.slice(0, -1) : fields).map((field) => fieldName(field))
  return read(node, { kind: 'column', name, star, at: node.at })
}

function fieldName(field: RawNode): string {
  if (field.tag !== 'String') return field.refuse()
  const name = field.text('sval')
  field.done()
  return name
}

const logicWords = { AND_EXPR: 'and', OR_EXPR: 'or', NOT_EXPR: 'not' } as const

const readLogic: Read = (node, reader) => {
  const word = node.choice('boolop', logicWords)
  const args = each(node, 'args', reader)
  if (word !== 'not') return read(node, { kind: 'logic', word, args, at: node.at })
  const [arg] = args
  if (arg === undefined || args.length !== 1) return node.refuse()
  return read(node, { kind: 'not', arg, at: node.at })
}

const readCase: Read = (node, reader) => {
  const arg = node.node('arg')
  const otherwise = node.node('defresult')
  const whens = node.nodes('args').map((item) => {
    if (item.tag !== 'CaseWhen') return item.refuse()
    const when = { when: reader.expr(item.need('expr')), then: reader.expr(item.need('result')) }
    item.done()
    return when
  })
  return read(node, { kind: 'case', arg: arg && reader.expr(arg), whens, otherwise: otherwise && reader.expr(otherwise), at: node.at })
}

const nullTests = { IS_NULL: false, IS_NOT_NULL: true } as const

const booleanTests = {
  IS_TRUE: { test: 'true', negated: false },
  IS_NOT_TRUE: { test: 'true', negated: true },
  IS_FALSE: { test: 'false', negated: false },
  IS_NOT_FALSE: { test: 'false', negated: true },
  IS_UNKNOWN: { test: 'unknown', negated: false },
  IS_NOT_UNKNOWN: { test: 'unknown', negated: true },
} as const

const valueFunctions = {
  SVFOP_CURRENT_DATE: 'current_date',
  SVFOP_CURRENT_TIME: 'current_time',
  SVFOP_CURRENT_TIME_N: 'current_time',
  SVFOP_CURRENT_TIMESTAMP: 'current_timestamp',
  SVFOP_CURRENT_TIMESTAMP_N: 'current_timestamp',
  SVFOP_LOCALTIME: 'localtime',
  SVFOP_LOCALTIME_N: 'localtime',
  SVFOP_LOCALTIMESTAMP: 'localtimestamp',
  SVFOP_LOCALTIMESTAMP_N: 'localtimestamp',
  SVFOP_CURRENT_ROLE: 'current_role',
  SVFOP_CURRENT_USER: 'current_user',
  SVFOP_USER: 'user',
  SVFOP_SESSION_USER: 'session_user',
  SVFOP_CURRENT_CATALOG: 'current_catalog',
  SVFOP_CURRENT_SCHEMA: 'current_schema',
} as const

const rowFormats = { COERCE_EXPLICIT_CALL: true, COERCE_IMPLICIT_CAST: false } as const

const readSubscript: Read = (node, reader) => {
  const arg = reader.expr(node.need('arg'))
  const steps = node.nodes('indirection').map((step) => readStep(step, reader))
  return read(node, { kind: 'subscript', arg, steps, at: arg.at >= 0 ? arg.at : node.at })
}

function readStep(step: RawNode, reader: Reader): Subscript {
  if (step.tag === 'String') return { kind: 'field', name: fieldName(step) }
  if (step.tag === 'A_Star') {
    step.done()
    return { kind: 'all-fields' }
  }
  if (step.tag !== 'A_Indices') return step.refuse()
  const slice = step.flag('is_slice')
  const low = step.node('lidx')
  const high = step.node('uidx')
  step.done()
  if (slice) return { kind: 'slice', low: low && reader.expr(low), high: high && reader.expr(high) }
  if (high === null || low !== null) return step.refuse()
  return { kind: 'index', index: reader.expr(high) }
}

const links = { EXISTS_SUBLINK: 'exists', ANY_SUBLINK: 'any', ALL_SUBLINK: 'all', EXPR_SUBLINK: 'scalar', ARRAY_SUBLINK: 'array' } as const

const readSublink: Read = (node, reader) => {
  const link = node.choice('subLinkType', links)
  const test = node.node('testexpr')
  const operator: Name = node.strings('operName')
  if ((link === 'any' || link === 'all') !== (test !== null)) return node.refuse()
  return read(node, { kind: 'sublink', link, test: test && reader.expr(test), operator, query: reader.query(node.need('subselect')), at: node.at })
}

const readers: Readonly<Record<string, Read>> = {
  A_Const: readConstant,
  ColumnRef: readColumn,
  ParamRef: (node) => read(node, { kind: 'parameter', number: node.number('number'), at: node.at }),
  A_Expr: readOperator,
  BoolExpr: readLogic,
  FuncCall: readCall,
  CaseExpr: readCase,
  A_Indirection: readSubscript,
  SubLink: readSublink,
  NamedArgExpr: (node, reader) => {
    node.only('argnumber', -1)
    return read(node, { kind: 'named-argument', name: node.text('name'), value: reader.expr(node.need('arg')), at: node.at })
  },
  NullTest: (node, reader) => read(node, { kind: 'is-null', arg: reader.expr(node.need('arg')), negated: node.choice('nulltesttype', nullTests), at: node.at }),
  BooleanTest: (node, reader) =>
    read(node, { kind: 'is-boolean', arg: reader.expr(node.need('arg')), ...node.choice('booltesttype', booleanTests), at: node.at }),
  TypeCast: (node, reader) => {
    const arg = reader.expr(node.need('arg'))
    return read(node, { kind: 'cast', arg, type: readTypeField(node, 'typeName', reader), at: node.at })
  },
  CoalesceExpr: (node, reader) => read(node, { kind: 'coalesce', args: each(node, 'args', reader), at: node.at }),
  MinMaxExpr: (node, reader) =>
    read(node, {
      kind: 'extreme',
      word: node.choice('op', { IS_GREATEST: 'greatest', IS_LEAST: 'least' } as const),
      args: each(node, 'args', reader),
      at: node.at,
    }),
  SQLValueFunction: (node) => read(node, { kind: 'value-function', word: node.choice('op', valueFunctions), precision: node.number('typmod'), at: node.at }),
  RowExpr: (node, reader) => read(node, { kind: 'row', args: each(node, 'args', reader), explicit: node.choice('row_format', rowFormats), at: node.at }),
  A_ArrayExpr: (node, reader) => read(node, { kind: 'array', items: each(node, 'elements', reader), at: node.at }),
  CollateClause: (node, reader) => read(node, { kind: 'collate', arg: reader.expr(node.need('arg')), collation: readName(node, 'collname'), at: node.at }),
  GroupingFunc: (node, reader) => read(node, { kind: 'grouping', args: each(node, 'args', reader), at: node.at }),
  SetToDefault: (node) => read(node, { kind: 'default', at: node.at }),
}
