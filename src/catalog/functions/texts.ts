import { refuse } from '../../base/refusal.ts'
import type { Scalar } from '../scalar.ts'
import { scalarType } from '../scalar-type.ts'
import { apply } from './apply.ts'
import { settle } from './comparisons.ts'
import type { FormName } from './forms.ts'

const textType = scalarType('text')

function asText(scalar: Scalar, what: string, at: number): Scalar {
  const settled = settle(scalar, textType)
  if (settled.type.family !== 'text') refuse('expr.unsupported', { what: `${what} over ${settled.type.name}` }, at)
  return settled
}

/** a LIKE pattern: the pattern is a constant or a parameter, so that no row can hand in an odd one. */
export function like(word: 'like' | 'ilike', arg: Scalar, pattern: Scalar, negated: boolean, at: number): Scalar {
  const settled = settle(pattern, textType)
  if (settled.node.kind === 'parameter')
    return apply('like', [asText(arg, 'LIKE', at), settled], scalarType('bool'), { at, words: [word, negated ? 'not' : ''] })
  if (settled.node.kind !== 'constant') refuse('expr.unsupported', { what: 'LIKE with a pattern that is not a constant' }, pattern.at)
  const text = settled.node.text ?? ''
  const escapes = /\\*$/.exec(text)?.[0].length ?? 0
  if (escapes % 2 === 1) refuse('expr.unsupported', { what: 'a LIKE pattern that ends in an escape' }, pattern.at)
  return apply('like', [asText(arg, 'LIKE', at), settled], scalarType('bool'), { at, words: [word, negated ? 'not' : ''] })
}

export function concat(left: Scalar, right: Scalar, at: number): Scalar {
  return apply('concat', [asText(left, '||', at), asText(right, '||', at)], textType, { at })
}

const plain: Readonly<Record<string, FormName>> = { lower: 'lower', upper: 'upper', btrim: 'btrim', ltrim: 'ltrim', rtrim: 'rtrim' }
const lengths: ReadonlySet<string> = new Set(['length', 'char_length', 'character_length'])

/** Functions of text; null where the name is none of them. */
export function textFunction(name: string, args: readonly Scalar[], at: number): Scalar | null {
  const [first] = args
  if (first === undefined) return null
  const form = plain[name]
  if (form !== undefined && args.length === 1) return apply(form, [asText(first, name, at)], textType, { at })
  if (lengths.has(name) && args.length === 1) return apply('length', [asText(first, name, at)], scalarType('int4'), { at, range: null })
  if ((name === 'left' || name === 'right') && args.length === 2)
    return apply(name, [asText(first, name, at)], textType, { at, words: [constantInteger(args[1], -1000, name, at)] })
  if ((name === 'substr' || name === 'substring') && (args.length === 2 || args.length === 3)) {
    const words = [constantInteger(args[1], -1000, name, at), ...(args.length === 3 ? [constantInteger(args[2], 0, name, at)] : [])]
    return apply('substring', [asText(first, name, at)], textType, { at, words })
  }
  return null
}

function constantInteger(arg: Scalar | undefined, least: number, name: string, at: number): string {
  const text = arg?.node.kind === 'constant' && arg.type.family === 'integer' ? arg.node.text : null
  const value = text === null ? null : BigInt(text)
  if (value === null || value < BigInt(least) || value > 1000n)
    return refuse('expr.unsupported', { what: `${name} with a position that is not a constant from ${String(least)} to 1000` }, arg?.at ?? at)
  return value.toString()
}
