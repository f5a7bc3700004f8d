import type { RawNode } from './raw.ts'
import type { Reader } from './read-port.ts'
import { readName, readOrder, readWindow } from './read-parts.ts'
import { sqlForms } from './sql-forms.ts'
import type { Call, Expr } from './tree.ts'

/** FuncCall. */
export function readCall(node: RawNode, reader: Reader): Expr {
  const filter = node.node('agg_filter')
  const over = node.part('over', 'WindowDef')
  const call: Call = {
    kind: 'call',
    name: readName(node, 'funcname'),
    args: node.nodes('args').map((item) => reader.expr(item)),
    star: node.flag('agg_star'),
    distinct: node.flag('agg_distinct'),
    variadic: node.flag('func_variadic'),
    order: readOrder(node, 'agg_order', reader),
    within: node.flag('agg_within_group'),
    filter: filter && reader.expr(filter),
    over: over && readWindow(over, reader),
    syntax: node.choice('funcformat', { COERCE_EXPLICIT_CALL: 'plain', COERCE_SQL_SYNTAX: 'sql' } as const),
    at: node.at,
  }
  node.done()
  if (call.syntax === 'sql' && !hasSqlForm(call)) node.refuse('funcname')
  return call
}

function hasSqlForm(call: Call): boolean {
  const name = call.name[1]
  if (call.name.length !== 2 || call.name[0] !== 'pg_catalog' || name === undefined) return false
  return Object.hasOwn(sqlForms, name) && sqlForms[name]?.counts.includes(call.args.length) === true
}
