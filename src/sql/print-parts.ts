import { check, unreachable } from '../base/check.ts'
import { levels } from './print-port.ts'
import type { Printer } from './print-port.ts'
import { operatorText, quoteName, quotePath, quoteString } from './quote.ts'
import type { Alias, Constant, SortItem, TypeRef, Window, WindowFrame } from './tree.ts'

/** A constant. Numbers are printed as they were typed. */
export function constantText(constant: Constant): string {
  switch (constant.kind) {
    case 'integer':
      check(/^[0-9]+$/.test(constant.value), 'an integer constant has digits only')
      return constant.value
    case 'decimal':
      check(/^(?:[0-9]|\.[0-9])[0-9a-zA-Z_.]*(?:[eE][-+][0-9_]+)?$/.test(constant.value), 'a decimal constant is a number as typed')
      return constant.value
    case 'string':
      return quoteString(constant.value)
    case 'bits':
      check(/^[bx][^'\\]*$/.test(constant.value), 'a bit string holds no quote')
      return `${constant.value.slice(0, 1)}'${constant.value.slice(1)}'`
    case 'boolean':
      return constant.value ? 'true' : 'false'
    case 'null':
      return 'NULL'
    default:
      return unreachable(constant)
  }
}

/** A type, in the generic spelling: every type of PostgreSQL can be named so, with the same modifiers. */
export function typeText(type: TypeRef, printer: Printer): string {
  const modifiers = type.modifiers.length === 0 ? '' : `(${type.modifiers.map((item) => printer.expr(item)).join(', ')})`
  const array = type.array.map((bound) => (bound < 0 ? '[]' : `[${bound}]`)).join('')
  return `${type.setof ? 'SETOF ' : ''}${quotePath(type.name)}${modifiers}${array}`
}

/** ` AS a (b, c)`, or nothing. */
export function aliasText(alias: Alias | null): string {
  if (alias === null) return ''
  return ` AS ${quoteName(alias.name)}${alias.columns.length === 0 ? '' : ` ${nameList(alias.columns)}`}`
}

/** `(a, b)` */
export function nameList(names: readonly string[]): string {
  return `(${names.map(quoteName).join(', ')})`
}

/** `ORDER BY …`, or nothing. */
export function orderText(order: readonly SortItem[], printer: Printer): string {
  return order.length === 0 ? '' : `ORDER BY ${order.map((item) => sortText(item, printer)).join(', ')}`
}

const nullWords = { default: '', first: ' NULLS FIRST', last: ' NULLS LAST' } as const

function sortText(item: SortItem, printer: Printer): string {
  const using = item.direction === 'using' ? ` USING ${operatorText(item.using)}` : ''
  const direction = item.direction === 'asc' ? ' ASC' : item.direction === 'desc' ? ' DESC' : using
  return printer.expr(item.by) + direction + nullWords[item.nulls]
}

/** What stands between a window's parentheses. */
export function windowText(window: Window, printer: Printer): string {
  const parts = [
    window.refers === '' ? '' : quoteName(window.refers),
    window.partition.length === 0 ? '' : `PARTITION BY ${window.partition.map((item) => printer.expr(item)).join(', ')}`,
    orderText(window.order, printer),
    frameText(window.frame, printer),
  ]
  return parts.filter((part) => part !== '').join(' ')
}

/** The bits of frameOptions, from PostgreSQL 18's src/include/nodes/parsenodes.h. */
const frame = {
  written: 0x1,
  range: 0x2,
  rows: 0x4,
  groups: 0x8,
  between: 0x10,
  excludeRow: 0x8000,
  excludeGroup: 0x10000,
  excludeTies: 0x20000,
} as const

const startWords: readonly (readonly [bit: number, words: string])[] = [
  [0x20, 'UNBOUNDED PRECEDING'],
  [0x200, 'CURRENT ROW'],
  [0x800, 'PRECEDING'],
  [0x2000, 'FOLLOWING'],
]

const endWords: readonly (readonly [bit: number, words: string])[] = [
  [0x100, 'UNBOUNDED FOLLOWING'],
  [0x400, 'CURRENT ROW'],
  [0x1000, 'PRECEDING'],
  [0x4000, 'FOLLOWING'],
]

function frameText(window: WindowFrame, printer: Printer): string {
  const has = (bit: number): boolean => (window.options & bit) !== 0
  if (!has(frame.written)) return ''
  const unit = has(frame.rows) ? 'ROWS' : has(frame.groups) ? 'GROUPS' : 'RANGE'
  const bound = (words: typeof startWords, offset: WindowFrame['start']): string => {
    const found = words.find(([bit]) => has(bit))
    check(found !== undefined, 'a frame has both ends')
    return offset === null ? found[1] : `${printer.expr(offset, levels.primary)} ${found[1]}`
  }
  const start = bound(startWords, window.start)
  const span = has(frame.between) ? `BETWEEN ${start} AND ${bound(endWords, window.end)}` : start
  const exclude = has(frame.excludeRow) ? ' EXCLUDE CURRENT ROW' : has(frame.excludeGroup) ? ' EXCLUDE GROUP' : has(frame.excludeTies) ? ' EXCLUDE TIES' : ''
  return `${unit} ${span}${exclude}`
}
