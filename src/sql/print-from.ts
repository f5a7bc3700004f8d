import { unreachable } from '../base/check.ts'
import { functionText } from './print-expr.ts'
import { aliasText, nameList, typeText } from './print-parts.ts'
import type { Printer } from './print-port.ts'
import { quoteName, quotePath } from './quote.ts'
import type { ColumnDefinition, FromItem } from './tree.ts'

type Of<K extends FromItem['kind']> = Extract<FromItem, { readonly kind: K }>

/** One item of a FROM list. */
export function fromText(item: FromItem, printer: Printer): string {
  switch (item.kind) {
    case 'table':
      return `${item.only ? 'ONLY ' : ''}${quotePath(item.name)}${aliasText(item.alias)}`
    case 'subquery':
      return `${item.lateral ? 'LATERAL ' : ''}(${printer.query(item.query)})${aliasText(item.alias)}`
    case 'function':
      return functionItemText(item, printer)
    case 'join':
      return joinText(item, printer)
    default:
      return unreachable(item)
  }
}

function definitionsText(definitions: readonly ColumnDefinition[], printer: Printer): string {
  return `(${definitions.map((column) => `${quoteName(column.name)} ${typeText(column.type, printer)}`).join(', ')})`
}

function functionItemText(item: Of<'function'>, printer: Printer): string {
  const functions = item.functions.map(({ call, definitions }) => {
    return functionText(call, printer) + (definitions.length === 0 ? '' : ` AS ${definitionsText(definitions, printer)}`)
  })
  const body = item.rowsFrom ? `ROWS FROM (${functions.join(', ')})` : functions.join(', ')
  const before = `${item.lateral ? 'LATERAL ' : ''}${body}${item.ordinality ? ' WITH ORDINALITY' : ''}`
  if (item.definitions.length === 0) return before + aliasText(item.alias)
  return `${before}${aliasText(item.alias) || ' AS'} ${definitionsText(item.definitions, printer)}`
}

const joinWords = { inner: 'JOIN', left: 'LEFT JOIN', right: 'RIGHT JOIN', full: 'FULL JOIN' } as const

function joinText(item: Of<'join'>, printer: Printer): string {
  const right = item.right.kind === 'join' && item.right.alias === null ? `(${fromText(item.right, printer)})` : fromText(item.right, printer)
  const cross = item.type === 'inner' && !item.natural && item.on === null && item.using.length === 0
  const words = cross ? 'CROSS JOIN' : `${item.natural ? 'NATURAL ' : ''}${joinWords[item.type]}`
  const using = item.using.length === 0 ? '' : ` USING ${nameList(item.using)}${aliasText(item.usingAlias)}`
  const on = item.on === null ? '' : ` ON ${printer.expr(item.on)}`
  const text = `${fromText(item.left, printer)} ${words} ${right}${using}${on}`
  return item.alias === null ? text : `(${text})${aliasText(item.alias)}`
}
