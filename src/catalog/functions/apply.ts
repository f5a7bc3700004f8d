import type { Range, Scalar } from '../scalar.ts'
import type { ScalarType } from '../scalar-type.ts'
import { type FormName, formOf } from './forms.ts'

interface More {
  readonly words?: readonly string[]
  readonly range?: Range | null
  readonly nullable?: boolean
  readonly at: number
}

/** A node over the row `form`; the resolvers in this folder are the only callers, so that every expression is one of the table. */
export function apply(form: FormName, args: readonly Scalar[], type: ScalarType, more: More): Scalar {
  formOf(form)
  return {
    type,
    node: { kind: 'apply', form, args, words: more.words ?? [] },
    nullable: more.nullable ?? args.some(arg => arg.nullable),
    range: more.range ?? null,
    carrier: 'own',
    at: more.at,
  }
}
