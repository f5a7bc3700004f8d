import { check, unreachable } from '../base/check.ts'
import { constantText, nameList, typeText } from './print-parts.ts'
import type { Printer } from './print-port.ts'
import { queryText } from './print-query.ts'
import { quoteField, quoteName, quotePath } from './quote.ts'
import type { IntoTable, Option, Statement } from './tree.ts'

type Of<K extends Statement['kind']> = Extract<Statement, { readonly kind: K }>

/** A statement without a semicolon. One of kind 'other' has no text of ours. */
export function statementText(s: Statement, printer: Printer): string {
  switch (s.kind) {
    case 'query':
      return printer.query(s.query)
    case 'select-into':
      return queryText(s.query, printer, `INTO ${persistenceWords[s.into.persistence]}TABLE ${quotePath(s.into.name)}`)
    case 'create-table-as':
      return createTableText(s, printer)
    case 'create-view':
      return createViewText(s, printer)
    case 'insert': {
      const alias = s.alias === '' ? '' : ` AS ${quoteName(s.alias)}`
      return `INSERT INTO ${quotePath(s.table)}${alias}${after(s.columns)} ${printer.query(s.query)}`
    }
    case 'declare-cursor':
      return cursorText(s, printer)
    case 'copy-to-stdout':
      return `COPY (${printer.query(s.query)}) TO STDOUT${copyOptions(s.options)}`
    case 'prepare': {
      const types = s.types.length === 0 ? '' : ` (${s.types.map((type) => typeText(type, printer)).join(', ')})`
      return `PREPARE ${quoteName(s.name)}${types} AS ${statementText(s.statement, printer)}`
    }
    case 'explain':
      return `EXPLAIN ${s.options.length === 0 ? '' : `(${s.options.map(optionText).join(', ')}) `}${statementText(s.statement, printer)}`
    case 'other':
      return check(false, 'a statement that was not read is not printed') as never
    default:
      return unreachable(s)
  }
}

const persistenceWords = { permanent: '', temporary: 'TEMPORARY ', unlogged: 'UNLOGGED ' } as const
const commitWords = { default: '', preserve: ' ON COMMIT PRESERVE ROWS', delete: ' ON COMMIT DELETE ROWS', drop: ' ON COMMIT DROP' } as const

function after(columns: readonly string[]): string {
  return columns.length === 0 ? '' : ` ${nameList(columns)}`
}

function targetText(into: IntoTable): string {
  return `${quotePath(into.name)}${after(into.columns)}${commitWords[into.onCommit]}`
}

function createTableText(s: Of<'create-table-as'>, printer: Printer): string {
  const before = `CREATE ${persistenceWords[s.into.persistence]}TABLE ${s.ifNotExists ? 'IF NOT EXISTS ' : ''}`
  return `${before}${targetText(s.into)} AS ${statementText(s.statement, printer)}${s.withData ? '' : ' WITH NO DATA'}`
}

function createViewText(s: Of<'create-view'>, printer: Printer): string {
  const before = `CREATE ${s.replace ? 'OR REPLACE ' : ''}${s.temporary ? 'TEMPORARY ' : ''}VIEW ${quotePath(s.name)}${after(s.columns)}`
  const options = s.options.map((option) => `${quoteField(option.name)}${option.value === null ? '' : ` = ${constantText(option.value)}`}`)
  return `${before}${options.length === 0 ? '' : ` WITH (${options.join(', ')})`} AS ${printer.query(s.query)}`
}

/** The bits of a cursor's options, from PostgreSQL 18's src/include/nodes/parsenodes.h. */
const cursorWords: readonly (readonly [bit: number, word: string])[] = [
  [0x1, 'BINARY'],
  [0x8, 'INSENSITIVE'],
  [0x10, 'ASENSITIVE'],
  [0x4, 'NO SCROLL'],
  [0x2, 'SCROLL'],
]
const cursorHold = 0x20

function cursorText(s: Of<'declare-cursor'>, printer: Printer): string {
  const words = cursorWords.filter(([bit]) => (s.options & bit) !== 0).map(([, word]) => `${word} `)
  return `DECLARE ${quoteName(s.name)} ${words.join('')}CURSOR ${(s.options & cursorHold) === 0 ? '' : 'WITH HOLD '}FOR ${printer.query(s.query)}`
}

function optionText(option: Option): string {
  return `${quoteName(option.name)}${option.value === null ? '' : ` ${constantText(option.value)}`}`
}

/** A truth value among the options comes from COPY's old spelling only, so all of them are printed in it. */
function copyOptions(options: readonly Option[]): string {
  if (options.length === 0) return ''
  if (!options.some((option) => option.value?.kind === 'boolean')) return ` WITH (${options.map(optionText).join(', ')})`
  return options.map(oldCopyOption).join('')
}

function oldCopyOption(option: Option): string {
  const value = option.value
  if (value?.kind === 'boolean') return ` ${option.name === 'header' ? 'HEADER' : 'FREEZE'}`
  check(value?.kind === 'string' && /^[a-z]+$/.test(option.name), "an option in COPY's old spelling has a text")
  if (option.name === 'format') return value.value === 'csv' ? ' CSV' : ' BINARY'
  return ` ${option.name.toUpperCase()} ${constantText(value)}`
}
