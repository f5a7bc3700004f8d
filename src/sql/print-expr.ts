import { check, unreachable } from '../base/check.ts'
import { callLevel, callText } from './print-call.ts'
import { constantText, typeText } from './print-parts.ts'
import { levels } from './print-port.ts'
import type { Printer } from './print-port.ts'
import { operatorText, quoteField, quoteName, quotePath } from './quote.ts'
import type { Expr, Subscript } from './tree.ts'

type Of<K extends Expr['kind']> = Extract<Expr, { readonly kind: K }>

interface Way<K extends Expr['kind']> {
  readonly level: number | ((e: Of<K>) => number)
  readonly text: (e: Of<K>, printer: Printer) => string
}

/** Prints an expression for a place that demands `level`. */
export function exprText(e: Expr, level: number, printer: Printer): string {
  const way = ways[e.kind] as Way<Expr['kind']>
  const own = typeof way.level === 'number' ? way.level : way.level(e as never)
  const text = way.text(e as never, printer)
  return own < level ? `(${text})` : text
}

const comparisons: ReadonlySet<string> = new Set(['=', '<', '>', '<=', '>=', '<>'])
const additions: ReadonlySet<string> = new Set(['+', '-'])
const multiplications: ReadonlySet<string> = new Set(['*', '/', '%'])

function operatorLevel(e: Of<'operator'>): number {
  const symbol = e.name.length === 1 ? (e.name[0] ?? '') : ''
  if (e.left === null) return additions.has(symbol) ? levels.sign : levels.or
  if (comparisons.has(symbol)) return levels.compare
  if (additions.has(symbol)) return levels.add
  if (multiplications.has(symbol)) return levels.multiply
  return symbol === '^' ? levels.power : levels.op
}

function operatorExprText(e: Of<'operator'>, printer: Printer): string {
  const level = operatorLevel(e)
  const symbol = operatorText(e.name)
  if (e.left === null) {
    const constant = e.right.kind === 'constant' && level === levels.sign
    return `${symbol}${constant ? '' : ' '}${printer.expr(e.right, levels.cast)}`
  }
  const grouped = level === levels.compare || level === levels.op
  return `${printer.expr(e.left, grouped ? level + 1 : level)} ${symbol} ${printer.expr(e.right, level + 1)}`
}

function logicText(e: Of<'logic'>, printer: Printer): string {
  check(e.args.length > 1, 'AND and OR join two or more')
  const level = e.word === 'and' ? levels.not : levels.and
  return e.args.map((arg) => printer.expr(arg, level)).join(e.word === 'and' ? ' AND ' : ' OR ')
}

function likeText(e: Of<'like'>, printer: Printer): string {
  const word = e.word === 'similar' ? 'SIMILAR TO' : e.word.toUpperCase()
  const { pattern, escape } = patternOf(e)
  const after = escape === null ? '' : ` ESCAPE ${printer.expr(escape, levels.op)}`
  return `${printer.expr(e.arg, levels.op)} ${e.negated ? 'NOT ' : ''}${word} ${printer.expr(pattern, levels.op)}${after}`
}

/** ESCAPE arrives as a call around the pattern, SIMILAR TO always as one. */
function patternOf(e: Of<'like'>): { readonly pattern: Expr; readonly escape: Expr | null } {
  const name = e.word === 'similar' ? 'similar_to_escape' : 'like_escape'
  const call = e.pattern
  if (call.kind === 'call' && call.name.join('.') === `pg_catalog.${name}` && call.syntax === 'plain') {
    const [pattern, escape] = call.args
    const known = call.args.length === 2 || (call.args.length === 1 && e.word === 'similar')
    if (pattern !== undefined && known) return { pattern, escape: escape ?? null }
  }
  check(e.word !== 'similar', 'the pattern of SIMILAR TO is a call of similar_to_escape')
  return { pattern: call, escape: null }
}

function betweenText(e: Of<'between'>, printer: Printer): string {
  const words = `${e.negated ? 'NOT ' : ''}BETWEEN ${e.symmetric ? 'SYMMETRIC ' : ''}`
  return `${printer.expr(e.arg, levels.op)} ${words}${printer.expr(e.low, levels.sign)} AND ${printer.expr(e.high, levels.sign)}`
}

function caseText(e: Of<'case'>, printer: Printer): string {
  const arg = e.arg === null ? '' : ` ${printer.expr(e.arg)}`
  const whens = e.whens.map((item) => ` WHEN ${printer.expr(item.when)} THEN ${printer.expr(item.then)}`).join('')
  const otherwise = e.otherwise === null ? '' : ` ELSE ${printer.expr(e.otherwise)}`
  return `CASE${arg}${whens}${otherwise} END`
}

function subscriptText(e: Of<'subscript'>, printer: Printer): string {
  const first = e.steps[0]?.kind
  const bare = (e.arg.kind === 'column' && !e.arg.star && (first === 'index' || first === 'slice')) || isParenthesised(e.arg)
  const arg = printer.expr(e.arg)
  return (bare ? arg : `(${arg})`) + e.steps.map((step) => stepText(step, printer)).join('')
}

function isParenthesised(e: Expr): boolean {
  return e.kind === 'sublink' && e.link === 'scalar'
}

function stepText(step: Subscript, printer: Printer): string {
  const bound = (e: Expr | null): string => (e === null ? '' : printer.expr(e, levels.add))
  switch (step.kind) {
    case 'index':
      return `[${printer.expr(step.index)}]`
    case 'slice':
      return `[${bound(step.low)}${step.low === null ? '' : ' '}:${step.high === null ? '' : ' '}${bound(step.high)}]`
    case 'field':
      return `.${quoteField(step.name)}`
    case 'all-fields':
      return '.*'
    default:
      return unreachable(step)
  }
}

/** An operator before ANY is looked at with its own level, whatever stands before it: no operand takes it bare. */
function sublinkLevel(e: Of<'sublink'>): number {
  if (e.link !== 'any' && e.link !== 'all') return levels.primary
  return e.operator.length === 0 ? levels.like : levels.is
}

function sublinkText(e: Of<'sublink'>, printer: Printer): string {
  const query = `(${printer.query(e.query)})`
  if (e.link === 'exists') return `EXISTS ${query}`
  if (e.link === 'array') return `ARRAY ${query}`
  if (e.link === 'scalar') return query
  check(e.test !== null, 'ANY and ALL compare something')
  const test = printer.expr(e.test, levels.add)
  if (e.operator.length === 0) return `${test} IN ${query}`
  return `${test} ${operatorText(e.operator)} ${e.link === 'any' ? 'ANY' : 'ALL'} ${query}`
}

/** A list of one subquery in parentheses would be read as that subquery. */
function notSubquery(e: Expr | undefined, what: string): void {
  check(e?.kind !== 'sublink' || e.link !== 'scalar', `${what} is no bare subquery`)
}

function list(args: readonly Expr[], printer: Printer): string {
  return args.map((arg) => printer.expr(arg)).join(', ')
}

function castText(e: Of<'cast'>, printer: Printer): string {
  return `${printer.expr(e.arg, levels.cast)}::${typeText(e.type, printer)}`
}

/** A function of FROM may be a cast, in its long spelling only. */
export function functionText(e: Expr, printer: Printer): string {
  return e.kind === 'cast' ? `CAST(${printer.expr(e.arg)} AS ${typeText(e.type, printer)})` : printer.expr(e)
}

const ways: { readonly [K in Expr['kind']]: Way<K> } = {
  column: {
    level: levels.primary,
    text: (e) => (e.star ? [...(e.name.length === 0 ? [] : [quotePath(e.name)]), '*'].join('.') : quotePath(e.name)),
  },
  parameter: { level: levels.primary, text: (e) => `$${e.number}` },
  constant: { level: levels.primary, text: (e) => constantText(e.constant) },
  call: { level: callLevel, text: callText },
  'named-argument': { level: levels.any, text: (e, printer) => `${quoteName(e.name)} => ${printer.expr(e.value)}` },
  operator: { level: operatorLevel, text: operatorExprText },
  logic: { level: (e) => (e.word === 'and' ? levels.and : levels.or), text: logicText },
  not: { level: levels.not, text: (e, printer) => `NOT ${printer.expr(e.arg, levels.cast)}` },
  'is-null': { level: levels.is, text: (e, printer) => `${printer.expr(e.arg, levels.op)} IS ${e.negated ? 'NOT ' : ''}NULL` },
  'is-boolean': {
    level: levels.is,
    text: (e, printer) => `${printer.expr(e.arg, levels.op)} IS ${e.negated ? 'NOT ' : ''}${e.test.toUpperCase()}`,
  },
  distinct: {
    level: levels.is,
    text: (e, printer) => `${printer.expr(e.left, levels.op)} IS ${e.negated ? 'NOT ' : ''}DISTINCT FROM ${printer.expr(e.right, levels.op)}`,
  },
  'in-list': {
    level: levels.like,
    text: (e, printer) => {
      check(e.list.length > 0, 'IN lists something')
      if (e.list.length === 1) notSubquery(e.list[0], 'the only item of IN')
      return `${printer.expr(e.arg, levels.op)} ${e.negated ? 'NOT ' : ''}IN (${list(e.list, printer)})`
    },
  },
  between: { level: levels.like, text: betweenText },
  like: { level: levels.like, text: likeText },
  quantified: {
    level: levels.is,
    text: (e, printer) => {
      notSubquery(e.right, 'the array of ANY')
      return `${printer.expr(e.left, levels.add)} ${operatorText(e.name)} ${e.all ? 'ALL' : 'ANY'} (${printer.expr(e.right)})`
    },
  },
  nullif: { level: levels.primary, text: (e, printer) => `NULLIF(${list([e.left, e.right], printer)})` },
  cast: { level: levels.cast, text: castText },
  case: { level: levels.primary, text: caseText },
  coalesce: { level: levels.primary, text: (e, printer) => `COALESCE(${list(e.args, printer)})` },
  extreme: { level: levels.primary, text: (e, printer) => `${e.word.toUpperCase()}(${list(e.args, printer)})` },
  'value-function': {
    level: levels.primary,
    text: (e) => {
      check(/^[a-z_]+$/.test(e.word), 'a value function is one word')
      return e.word.toUpperCase() + (e.precision < 0 ? '' : `(${e.precision})`)
    },
  },
  row: {
    level: levels.primary,
    text: (e, printer) => {
      check(e.explicit || e.args.length > 1, 'a row without the word has two or more')
      return `${e.explicit ? 'ROW' : ''}(${list(e.args, printer)})`
    },
  },
  array: { level: levels.primary, text: (e, printer) => `ARRAY[${list(e.items, printer)}]` },
  subscript: { level: levels.primary, text: subscriptText },
  collate: { level: levels.collate, text: (e, printer) => `${printer.expr(e.arg, levels.cast)} COLLATE ${quotePath(e.collation)}` },
  grouping: { level: levels.primary, text: (e, printer) => `GROUPING(${list(e.args, printer)})` },
  default: { level: levels.any, text: () => 'DEFAULT' },
  sublink: { level: sublinkLevel, text: sublinkText },
}
