import { check } from '../base/check.ts'
import { orderText, windowText } from './print-parts.ts'
import { levels } from './print-port.ts'
import type { Printer } from './print-port.ts'
import { quoteName, quotePath } from './quote.ts'
import { sqlForms } from './sql-forms.ts'
import type { SqlForm } from './sql-forms.ts'
import type { Call, Expr } from './tree.ts'

/** How tightly a printed call holds. */
export function callLevel(call: Call): number {
  return call.syntax === 'plain' ? levels.primary : levels[formOf(call).level]
}

/** A function call, an aggregate, a window function, or a function in words of its own. */
export function callText(call: Call, printer: Printer): string {
  if (call.syntax === 'sql') return formText(call, printer)
  const args = call.args.map((arg, index) => (call.variadic && index === call.args.length - 1 ? 'VARIADIC ' : '') + printer.expr(arg))
  const order = orderText(call.order, printer)
  const listed = call.star ? '*' : args.join(', ')
  const inside = `${call.distinct ? 'DISTINCT ' : ''}${listed}${order === '' || call.within ? '' : ` ${order}`}`
  const within = call.within ? ` WITHIN GROUP (${order})` : ''
  const filter = call.filter === null ? '' : ` FILTER (WHERE ${printer.expr(call.filter)})`
  return `${quotePath(call.name)}(${inside})${within}${filter}${overText(call, printer)}`
}

function overText(call: Call, printer: Printer): string {
  if (call.over === null) return ''
  return call.over.name === '' ? ` OVER (${windowText(call.over, printer)})` : ` OVER ${quoteName(call.over.name)}`
}

function formOf(call: Call): SqlForm {
  const form = sqlForms[call.name[1] ?? '']
  check(form !== undefined && call.name[0] === 'pg_catalog' && call.name.length === 2, 'a function with words of its own is known')
  return form
}

function formText(call: Call, printer: Printer): string {
  const form = formOf(call)
  const words = form.forms[Math.min(form.counts.indexOf(call.args.length), form.forms.length - 1)]
  check(words !== undefined, 'a function with words of its own has a known number of arguments')
  return words.replace(/\$(\d|\*)([!?]?)/g, (_, which: string, how: string) => {
    if (which === '*') return call.args.map((arg) => printer.expr(arg)).join(', ')
    const arg = call.args[Number(which) - 1]
    check(arg !== undefined, 'a form names arguments that are there')
    return how === '?' ? bareWord(arg) : printer.expr(arg, how === '!' ? levels.cast : levels.any)
  })
}

function bareWord(arg: Expr): string {
  const word = arg.kind === 'constant' && arg.constant.kind === 'string' ? arg.constant.value : ''
  check(/^NFK?[CD]$/.test(word), 'a normal form is one of the four')
  return word
}
