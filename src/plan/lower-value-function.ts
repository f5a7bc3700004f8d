import { refuse } from '../base/refusal.ts'
import { castTo } from '../catalog/functions/casts.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { scalarType } from '../catalog/scalar-type.ts'
import type { Context } from './context.ts'
import { fixedValue } from './lower-constant.ts'

/** now(): the instant at which the analyst's transaction began, the same in the lobby, the list of keys and the vault. */
export function lowerNow(context: Context, at: number): Scalar {
  return fixedValue(scalarType('timestamptz'), context.now, at)
}

/** current_date and its kin, from that one instant. */
export function lowerValueFunction(word: string, context: Context, at: number): Scalar {
  const now = lowerNow(context, at)
  switch (word) {
    case 'current_date':
      return castTo(now, scalarType('date'), at)
    case 'current_timestamp':
      return now
    case 'localtimestamp':
      return castTo(now, scalarType('timestamp'), at)
    default:
      return refuse('expr.function', { what: word }, at)
  }
}
