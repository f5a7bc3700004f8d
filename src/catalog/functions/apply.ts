import { refuse } from '../../base/refusal.ts'
import type { Range, Scalar, ScalarNode } from '../scalar.ts'
import type { ScalarType } from '../scalar-type.ts'
import { type FormName, formOf } from './forms.ts'

interface More {
  readonly words?: readonly string[]
  readonly range?: Range | null
  readonly nullable?: boolean
  readonly at: number
}

const largestExpression = 5000
const sizes = new WeakMap<ScalarNode, number>()

function sizeOf(scalar: Scalar): number {
  return sizes.get(scalar.node) ?? 1
}

/** The collations other than the database's that a text goes by. */
function collationsOf(scalar: Scalar): readonly string[] {
  if (scalar.type.family !== 'text') return []
  const { node } = scalar
  if (node.kind === 'column') return node.collation === undefined ? [] : [node.collation.name]
  return node.kind === 'apply' ? [...new Set(node.args.flatMap(collationsOf))] : []
}

/** A node over the row `form`; the resolvers in this folder are the only callers, so that every expression is one of the table. */
export function apply(form: FormName, args: readonly Scalar[], type: ScalarType, more: More): Scalar {
  formOf(form)
  const size = args.reduce((sum, arg) => sum + sizeOf(arg), 1)
  // derived tables that use a column twice double an expression each time
  if (size > largestExpression) refuse('expr.unsupported', { what: `an expression of more than ${largestExpression.toString()} parts` }, more.at)
  const collations = new Set(args.flatMap(collationsOf))
  // PostgreSQL finds out only on a row that it does not know which of them to go by, and raises there
  if (collations.size > 1) refuse('expr.unsupported', { what: 'text of two collations in one expression' }, more.at)
  const node: ScalarNode = { kind: 'apply', form, args, words: more.words ?? [] }
  sizes.set(node, size)
  return {
    type,
    node,
    nullable: more.nullable ?? args.some((arg) => arg.nullable),
    range: more.range ?? null,
    carrier: 'own',
    at: more.at,
  }
}
