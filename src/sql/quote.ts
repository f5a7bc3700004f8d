import { check } from '../base/check.ts'
import { keywords } from './keywords.ts'

/** Keywords that are so common as names, and so harmless in every place a name is printed, that quotes would only disturb. */
const plainKeywords: ReadonlySet<string> = new Set([
  'data',
  'day',
  'hour',
  'key',
  'label',
  'level',
  'location',
  'minute',
  'month',
  'name',
  'second',
  'text',
  'type',
  'value',
  'version',
  'year',
])

/** An identifier as SQL text, in quotes unless it is a plain lower-case word and no keyword. */
export function quoteName(name: string): string {
  const plain = /^[a-z_][a-z0-9_]*$/.test(name) && (!keywords.has(name) || plainKeywords.has(name))
  return plain ? name : quoted(name)
}

/** An identifier after a dot, where every keyword may stand. */
export function quoteField(name: string): string {
  return /^[a-z_][a-z0-9_]*$/.test(name) ? name : quoted(name)
}

/** A qualified name. */
export function quotePath(name: readonly string[]): string {
  check(name.length > 0, 'a name has a part')
  return name.map((part, index) => (index === 0 ? quoteName(part) : quoteField(part))).join('.')
}

/** A string constant that means the same whether standard_conforming_strings is on or off. */
export function quoteString(text: string): string {
  check(!text.includes('\0'), 'a string constant holds no NUL')
  const doubled = text.replaceAll("'", "''")
  return text.includes('\\') ? `E'${doubled.replaceAll('\\', '\\\\')}'` : `'${doubled}'`
}

function quoted(name: string): string {
  check(name !== '' && !name.includes('\0'), 'a name is not empty and holds no NUL')
  return `"${name.replaceAll('"', '""')}"`
}

/** An operator, qualified or not. */
export function operatorText(name: readonly string[]): string {
  const symbol = name.at(-1) ?? ''
  check(/^[-+*/<>=~!@#%^&|`?]+$/.test(symbol) && !symbol.includes('--') && !symbol.includes('/*'), 'an operator is made of operator characters')
  if (name.length === 1) return symbol
  return `OPERATOR(${name.slice(0, -1).map(quoteName).join('.')}.${symbol})`
}
