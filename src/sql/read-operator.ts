import { unreachable } from '../base/check.ts'
import type { RawNode } from './raw.ts'
import { readName } from './read-parts.ts'
import type { Reader } from './read-port.ts'
import type { Expr } from './tree.ts'

const kinds = {
  AEXPR_OP: 'op',
  AEXPR_OP_ANY: 'any',
  AEXPR_OP_ALL: 'all',
  AEXPR_DISTINCT: 'distinct',
  AEXPR_NOT_DISTINCT: 'not-distinct',
  AEXPR_NULLIF: 'nullif',
  AEXPR_IN: 'in',
  AEXPR_LIKE: 'like',
  AEXPR_ILIKE: 'ilike',
  AEXPR_SIMILAR: 'similar',
  AEXPR_BETWEEN: 'between',
  AEXPR_NOT_BETWEEN: 'not-between',
  AEXPR_BETWEEN_SYM: 'between-symmetric',
  AEXPR_NOT_BETWEEN_SYM: 'not-between-symmetric',
} as const

/** Names the parser puts beside a kind, though they say nothing more. */
const fixedNames: Readonly<Record<string, readonly string[]>> = {
  distinct: ['='],
  'not-distinct': ['='],
  nullif: ['='],
  in: ['=', '<>'],
  like: ['~~', '!~~'],
  ilike: ['~~*', '!~~*'],
  similar: ['~', '!~'],
  between: ['BETWEEN'],
  'not-between': ['NOT BETWEEN'],
  'between-symmetric': ['BETWEEN SYMMETRIC'],
  'not-between-symmetric': ['NOT BETWEEN SYMMETRIC'],
}

/** A_Expr, in all its kinds. */
export function readOperator(node: RawNode, reader: Reader): Expr {
  const kind = node.choice('kind', kinds)
  const name = readName(node, 'name')
  const word = name[0] ?? ''
  const fixed = fixedNames[kind]
  if (fixed !== undefined && (name.length !== 1 || !fixed.includes(word))) return node.refuse('name')
  const at = node.at
  const leftNode = node.node('lexpr')
  const rightNode = node.need('rexpr')
  node.done()

  if (kind === 'op') return { kind: 'operator', name, left: leftNode && reader.expr(leftNode), right: reader.expr(rightNode), at }
  if (leftNode === null) return node.refuse()
  const left = reader.expr(leftNode)

  switch (kind) {
    case 'any':
    case 'all':
      return { kind: 'quantified', left, name, all: kind === 'all', right: reader.expr(rightNode), at }
    case 'distinct':
    case 'not-distinct':
      return { kind: 'distinct', name, left, right: reader.expr(rightNode), negated: kind === 'not-distinct', at }
    case 'nullif':
      return { kind: 'nullif', name, left, right: reader.expr(rightNode), at }
    case 'in':
      return { kind: 'in-list', arg: left, list: readList(rightNode, reader), negated: word === '<>', at }
    case 'like':
    case 'ilike':
    case 'similar':
      return { kind: 'like', arg: left, pattern: reader.expr(rightNode), word: kind, operator: name, negated: word.startsWith('!'), at }
    case 'between':
    case 'not-between':
    case 'between-symmetric':
    case 'not-between-symmetric': {
      const [low, high, ...more] = readList(rightNode, reader)
      if (low === undefined || high === undefined || more.length > 0) return node.refuse()
      return { kind: 'between', arg: left, low, high, negated: kind.startsWith('not-'), symmetric: kind.endsWith('-symmetric'), at }
    }
    default:
      return unreachable(kind)
  }
}

function readList(node: RawNode, reader: Reader): readonly Expr[] {
  if (node.tag !== 'List') return node.refuse()
  const items = node.nodes('items').map((item) => reader.expr(item))
  node.done()
  return items
}
