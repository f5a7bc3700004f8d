import { RawNode } from './raw.ts'
import type { RawFields } from './raw.ts'
import { readExpr } from './read-expr.ts'
import type { Reader } from './read-port.ts'
import { readQuery } from './read-query.ts'
import { readStatement as readNode } from './read-statement.ts'
import type { Statement } from './tree.ts'

const reader: Reader = {
  expr: (node) => readExpr(node, reader),
  query: (node) => readQuery(node, reader),
}

/**
 * The parser's tree of one statement as ours. `start` is the statement's byte offset, the place of what has no place of its own.
 * Refuses with text.unreadable whatever the tree cannot hold in full, by INVARIANT WHOLE.
 */
export function readStatement(tree: RawFields, start: number): Statement {
  return readNode(new RawNode('RawStmt', { stmt: tree }, start).need('stmt'), reader)
}
