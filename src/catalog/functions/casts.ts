import { refuse } from '../../base/refusal.ts'
import type { Scalar } from '../scalar.ts'
import { isNumber, sameType, scalarType, type ScalarType } from '../scalar-type.ts'
import { apply } from './apply.ts'
import { clamped } from './clamped.ts'
import { settle } from './comparisons.ts'
import { truthNumber } from './conditions.ts'
import { castNumber } from './numbers.ts'
import { castTime } from './times.ts'

const instants: ReadonlySet<string> = new Set(['date', 'timestamp', 'timestamptz'])

/** CAST(arg AS type) where it cannot raise. A bare string is read as the type by the lobby first. */
export function castTo(arg: Scalar, type: ScalarType, at: number): Scalar {
  if (arg.type.family === 'unknown') return settle({ ...arg, at }, type)
  if (sameType(arg.type, type) && arg.carrier === 'own') return arg
  if (isNumber(arg.type) && isNumber(type)) return castNumber(type.family === 'integer' || arg.type.family !== 'integer' ? clamped(arg) : arg, type, at)
  if (type.family === 'text' && arg.carrier === 'own' && arg.type.family !== 'opaque')
    return apply('cast', [arg], type, { at, words: ['pg_catalog', type.name] })
  if (arg.type.family === 'bool' && type.name === 'int4') return truthNumber(arg, at)
  if (arg.type.name === 'int4' && arg.carrier === 'own' && type.family === 'bool') return apply('truth', [arg], scalarType('bool'), { at })
  if (instants.has(arg.type.family) && instants.has(type.family)) return castTime(arg, type.name, at)
  if (arg.type.family === 'text' && type.family === 'text') return apply('cast', [arg], type, { at, words: ['pg_catalog', type.name] })
  return refuse('expr.unsupported', { what: `a cast from ${arg.type.name} to ${type.name}` }, at)
}
