import { check, unreachable } from '../base/check.ts'
import { fromText } from './print-from.ts'
import { nameList, orderText, windowText } from './print-parts.ts'
import { levels } from './print-port.ts'
import type { Printer } from './print-port.ts'
import { quoteName } from './quote.ts'
import type { CommonTable, GroupItem, Query, Select, SetOperation } from './tree.ts'

/** A query without parentheses. `into`, where not empty, is put after the targets of its leftmost SELECT. */
export function queryText(query: Query, printer: Printer, into = ''): string {
  const order = orderText(query.order, printer)
  const parts = [withText(query, printer), bodyText(query.body, printer, into), order, limitText(query, printer)]
  return parts.filter((part) => part !== '').join(' ')
}

function limitText(query: Query, printer: Printer): string {
  const offset = query.offset === null ? '' : `OFFSET ${printer.expr(query.offset)}`
  if (query.limit === null) return offset
  if (!query.withTies) return `LIMIT ${printer.expr(query.limit)}${offset === '' ? '' : ` ${offset}`}`
  const rows = `FETCH FIRST ${printer.expr(query.limit, levels.primary)} ROWS WITH TIES`
  return offset === '' ? rows : `${offset} ${rows}`
}

const materializedWords = { default: '', always: 'MATERIALIZED ', never: 'NOT MATERIALIZED ' } as const

function withText(query: Query, printer: Printer): string {
  if (query.with === null) return ''
  const tables = query.with.tables.map((table) => commonTableText(table, printer)).join(', ')
  return `WITH ${query.with.recursive ? 'RECURSIVE ' : ''}${tables}`
}

function commonTableText(table: CommonTable, printer: Printer): string {
  const columns = table.columns.length === 0 ? '' : ` ${nameList(table.columns)}`
  return `${quoteName(table.name)}${columns} AS ${materializedWords[table.materialized]}(${printer.query(table.query)})`
}

function bodyText(body: Query['body'], printer: Printer, into: string): string {
  switch (body.kind) {
    case 'select':
      return selectText(body, printer, into)
    case 'set-operation':
      return setText(body, printer, into)
    case 'values':
      check(into === '' && body.rows.length > 0, 'VALUES has rows and no INTO')
      return `VALUES ${body.rows.map((row) => `(${row.map((item) => printer.expr(item)).join(', ')})`).join(', ')}`
    default:
      return unreachable(body)
  }
}

function setText(body: SetOperation, printer: Printer, into: string): string {
  return `${operandText(body.left, printer, into)} ${body.word.toUpperCase()}${body.all ? ' ALL' : ''} ${operandText(body.right, printer, '')}`
}

/** An operand stands bare when it is a plain SELECT or VALUES; anything more would reach past it. */
function operandText(query: Query, printer: Printer, into: string): string {
  const text = queryText(query, printer, into)
  const bare = query.body.kind !== 'set-operation' && query.with === null && query.order.length === 0 && query.limit === null && query.offset === null
  return bare ? text : `(${text})`
}

function selectText(select: Select, printer: Printer, into: string): string {
  const where = select.where === null ? '' : `WHERE ${printer.expr(select.where)}`
  const having = select.having === null ? '' : `HAVING ${printer.expr(select.having)}`
  const windows = select.windows.map((window) => `${quoteName(window.name)} AS (${windowText(window, printer)})`)
  const parts = [
    'SELECT',
    distinctText(select, printer),
    select.targets.map((target) => printer.expr(target.value) + (target.label === '' ? '' : ` AS ${quoteName(target.label)}`)).join(', '),
    into,
    select.from.length === 0 ? '' : `FROM ${select.from.map((item) => fromText(item, printer)).join(', ')}`,
    where,
    select.group.length === 0 ? '' : `GROUP BY ${select.groupDistinct ? 'DISTINCT ' : ''}${select.group.map((item) => groupText(item, printer)).join(', ')}`,
    having,
    windows.length === 0 ? '' : `WINDOW ${windows.join(', ')}`,
  ]
  return parts.filter((part) => part !== '').join(' ')
}

function distinctText(select: Select, printer: Printer): string {
  if (select.distinct === null) return ''
  if (select.distinct.length === 0) return 'DISTINCT'
  return `DISTINCT ON (${select.distinct.map((item) => printer.expr(item)).join(', ')})`
}

function groupText(item: GroupItem, printer: Printer): string {
  switch (item.kind) {
    case 'expression':
      return printer.expr(item.value)
    case 'empty':
      return '()'
    case 'sets':
      return `${item.word.toUpperCase()} (${item.items.map((inner) => groupText(inner, printer)).join(', ')})`
    default:
      return unreachable(item)
  }
}
