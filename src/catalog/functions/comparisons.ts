import { refuse } from '../../base/refusal.ts'
import type { Scalar } from '../scalar.ts'
import { isNumber, promote, sameType, scalarType, type ScalarType } from '../scalar-type.ts'
import { apply } from './apply.ts'
import { comparable } from './numbers.ts'

const bool = scalarType('bool')
const instants: ReadonlySet<string> = new Set(['date', 'timestamp', 'timestamptz'])

/** Whether PostgreSQL compares the two types by an operator that cannot raise. */
function match(a: ScalarType, b: ScalarType): boolean {
  if (isNumber(a) && isNumber(b)) return true
  if (instants.has(a.family) && instants.has(b.family)) return true
  if (a.family === 'enum' || b.family === 'enum') return sameType(a, b)
  return a.family === b.family && a.family !== 'unknown' && a.family !== 'opaque'
}

/** A bare string takes the type of what it is compared with; the lobby has already read it as that type. */
export function settle(scalar: Scalar, type: ScalarType): Scalar {
  if (scalar.type.family !== 'unknown') return scalar
  const settled = type.family === 'unknown' ? scalarType('text') : type.name === 'varchar' || type.name === 'bpchar' ? { ...type } : type
  return { ...scalar, type: settled, carrier: 'own' }
}

/** The type that several values share, as in CASE, coalesce, IN: the widest of numbers, else the first known one. A bare string is read as it. */
export function commonType(scalars: readonly Scalar[]): ScalarType {
  const known = scalars.map((scalar) => scalar.type).filter((type) => type.family !== 'unknown')
  if (known.length > 0 && known.every(isNumber)) return known.reduce(promote)
  return known[0] ?? scalarType('text')
}

/** a = b and its kin, also IS [NOT] DISTINCT FROM. */
export function compare(form: '=' | '<>' | '<' | '<=' | '>' | '>=' | 'distinct' | 'not-distinct', left: Scalar, right: Scalar, at: number): Scalar {
  const [a, b] = [settle(left, right.type), settle(right, left.type)]
  if (!match(a.type, b.type)) refuse('expr.unsupported', { what: `${form} between ${a.type.name} and ${b.type.name}` }, at)
  const [x, y] = comparable(a, b)
  return apply(form, [x, y], bool, { at, ...(form === 'distinct' || form === 'not-distinct' ? { nullable: false } : {}) })
}

/** a IN (…) over a list of the statement's own values or of the same row's. */
export function inList(arg: Scalar, list: readonly Scalar[], negated: boolean, at: number): Scalar {
  const type = commonType([arg, ...list])
  const settled = settle(arg, type)
  const entries = list.map((entry) => settle(entry, type))
  // PostgreSQL brings a list to one type: a date among instants can overflow there
  const odd = entries.find((entry) => instants.has(entry.type.family) && entry.type.family !== settled.type.family)
  if (odd !== undefined) refuse('expr.unsupported', { what: `IN between ${settled.type.name} and ${odd.type.name}` }, odd.at)
  for (const entry of entries)
    if (!match(settled.type, entry.type)) refuse('expr.unsupported', { what: `IN between ${settled.type.name} and ${entry.type.name}` }, entry.at)
  const pairs = entries.map((entry) => comparable(settled, entry))
  const subject = pairs.map(([left]) => left).find((left) => left !== settled) ?? settled
  return apply(negated ? 'not-in' : 'in', [subject, ...pairs.map(([, entry]) => entry)], bool, { at })
}
