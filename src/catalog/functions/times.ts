import { Fraction } from '../../base/fraction.ts'
import { refuse } from '../../base/refusal.ts'
import { isFixed, parts, type Scalar } from '../scalar.ts'
import { scalarType } from '../scalar-type.ts'
import { apply } from './apply.ts'
import { clamped, isClamped } from './clamped.ts'

export const truncUnits = [
  'microseconds',
  'milliseconds',
  'second',
  'minute',
  'hour',
  'day',
  'week',
  'month',
  'quarter',
  'year',
  'decade',
  'century',
  'millennium',
] as const

/** Fields of extract and date_part with the values they can take over any finite date or time; null: bounded by the clamp only. */
export const fieldRanges: Readonly<Record<string, readonly [number, number] | null>> = {
  minute: [0, 59],
  hour: [0, 23],
  day: [1, 31],
  dow: [0, 6],
  isodow: [1, 7],
  doy: [1, 366],
  week: [1, 53],
  month: [1, 12],
  quarter: [1, 4],
  year: null,
  isoyear: null,
  decade: null,
}

function bounded(value: Scalar): Scalar {
  const inside = clamped(value)
  if (!isClamped(inside)) refuse('expr.unbounded', { expression: inside.node.kind === 'column' ? `"${inside.node.column}"` : 'this date or time' }, inside.at)
  return inside
}

function isDateOrTime(scalar: Scalar): boolean {
  return scalar.type.family === 'date' || scalar.type.family === 'timestamp' || scalar.type.family === 'timestamptz'
}

/** date_trunc(unit, value). */
export function dateTrunc(unit: string, value: Scalar, at: number): Scalar {
  const plain = unit.toLowerCase()
  if (!(truncUnits as readonly string[]).includes(plain)) refuse('expr.unsupported', { what: `date_trunc with the unit "${unit}"` }, at)
  if (!isDateOrTime(value)) refuse('expr.unsupported', { what: `date_trunc over ${value.type.name}` }, at)
  const inside = bounded(value)
  const type = value.type.family === 'timestamp' ? value.type : scalarType('timestamptz')
  return apply('date-trunc', [inside], type, { words: [plain], at })
}

/** extract(field FROM value) gives numeric, date_part(field, value) float8. */
export function extract(field: string, value: Scalar, name: 'extract' | 'date_part', at: number): Scalar {
  const plain = field.toLowerCase()
  const range = fieldRanges[plain]
  if (range === undefined) refuse('expr.unsupported', { what: `${name} with the field "${field}"` }, at)
  if (!isDateOrTime(value)) refuse('expr.unsupported', { what: `${name} over ${value.type.name}` }, at)
  if (value.type.family === 'date' && (plain === 'hour' || plain === 'minute')) refuse('expr.unsupported', { what: `${name} of ${plain} from a date` }, at)
  const inside = bounded(value)
  const type = scalarType(name === 'extract' ? 'numeric' : 'float8')
  const [low, high] = range === null ? yearsOf(inside) : [BigInt(range[0]), BigInt(range[1])]
  const proved =
    range === null && plain === 'decade'
      ? { low: Fraction.make(low, 10n), high: Fraction.make(high, 10n) }
      : { low: Fraction.make(low), high: Fraction.make(high) }
  return apply('extract', [inside], type, {
    words: [plain, name],
    range: { low: Fraction.make(proved.low.floor()), high: Fraction.make(proved.high.ceil()), step: Fraction.one },
    at,
  })
}

/** The years of any date that PostgreSQL has. */
const allYears: readonly [bigint, bigint] = [-4714n, 5_874_898n]

/** The years a date or time can lie in, a year more at either end for zones, weeks and truncation: of plain constants and clamps; of what is computed otherwise, all there are. */
function yearsOf(scalar: Scalar): readonly [bigint, bigint] {
  const node = scalar.node
  const ends = node.kind === 'constant' ? [node.text, node.text] : node.kind === 'column' && node.clamped !== null ? [node.clamped.low, node.clamped.high] : []
  const [low, high] = ends.map((end) => /^\s*(\d{4,7})-\d\d?-\d\d?(?:[ T][\d:.+\-Z]*)?$/.exec(end ?? '')?.[1])
  if (low !== undefined && high !== undefined) return [BigInt(low) - 1n, BigInt(high) + 1n]
  const [arg] = node.kind === 'apply' && node.form === 'cast' ? node.args : []
  return arg === undefined || !isDateOrTime(arg) ? allYears : yearsOf(arg)
}

/** A date or time moved by an interval, or a date by whole days. */
export function shift(sign: '+' | '-', value: Scalar, by: Scalar, at: number): Scalar {
  if (!isFixed(by)) refuse('expr.unsupported', { what: 'a shift by an amount that differs from row to row' }, by.at)
  const inside = bounded(value)
  const type = value.type.family === 'date' && by.type.family === 'interval' ? scalarType('timestamp') : value.type
  return apply('shift', [inside, by], type, { words: [sign], at })
}

/** date - date, in days. */
export function daysBetween(left: Scalar, right: Scalar, at: number): Scalar {
  const [a, b] = [bounded(left), bounded(right)]
  const [from, to] = [yearsOf(a), yearsOf(b)]
  const days = (years: bigint): Fraction =>
    Fraction.make(years * 366n)
      .max(mostDays.neg())
      .min(mostDays)
  return apply('days-between', [a, b], scalarType('int4'), { range: { low: days(from[0] - to[1]), high: days(from[1] + 1n - to[0]), step: Fraction.one }, at })
}

/** timestamp - timestamp, an interval. */
export function timeBetween(left: Scalar, right: Scalar, at: number): Scalar {
  return apply('time-between', [bounded(left), bounded(right)], scalarType('interval'), { at })
}

/** Casts among dates and times. */
export function castTime(value: Scalar, to: string, at: number): Scalar {
  return apply('cast', [bounded(value)], scalarType(to), { words: ['pg_catalog', to], at })
}

const mostDays = Fraction.make(2n ** 31n - 1n)

const checkedAtTheEnds: ReadonlySet<string> = new Set(['shift', 'date-trunc', 'extract', 'cast', 'days-between', 'time-between'])

/**
 * What must be computed in the lobby before anything is debited, so that no row can make the vault raise: every operation on dates and times at every
 * combination of the ends of its clamps and of what a CASE or coalesce may put in their place (they are monotone in between).
 */
export function* endsOf(scalar: Scalar): Generator<Scalar> {
  for (const part of parts(scalar)) {
    if (part.node.kind !== 'apply' || !checkedAtTheEnds.has(part.node.form) || isFixed(part)) continue
    if (part.node.args.some(isDateOrTime) && isClamped(part)) yield* corners(part)
  }
}

const cornerCeiling = 64

/** Column-free scalars between which every value of `scalar` lies. */
function corners(scalar: Scalar): readonly Scalar[] {
  const node = scalar.node
  if (node.kind === 'column') return [atEnd(scalar, 'low'), atEnd(scalar, 'high')]
  if (node.kind !== 'apply' || isFixed(scalar)) return [scalar]
  switch (node.form) {
    case 'case':
      return node.args.filter((_, i) => i % 2 === 1 || i === node.args.length - 1).flatMap(corners)
    case 'coalesce':
    case 'greatest':
    case 'least':
      return node.args.flatMap(corners)
    case 'nullif':
      return node.args.slice(0, 1).flatMap(corners)
    default: {
      const combined = node.args.reduce<readonly (readonly Scalar[])[]>(
        (rows, arg) => rows.flatMap((row) => corners(arg).map((corner) => [...row, corner])),
        [[]],
      )
      if (combined.length > cornerCeiling) refuse('expr.unsupported', { what: 'a date or time with so many branches' }, scalar.at)
      return combined.map((args) => ({ ...scalar, node: { ...node, args } }))
    }
  }
}

const rising: ReadonlySet<string> = new Set(['shift', 'date-trunc', 'extract', 'cast'])

/** Whether the value lies between what it is at the low and at the high ends of its clamps, both finite: not so where values are chosen between. */
export function isBetweenEnds(scalar: Scalar): boolean {
  for (const part of parts(scalar)) if (part.node.kind === 'apply' && !isFixed(part) && !rising.has(part.node.form)) return false
  return true
}

/** The scalar with every clamped column at that end of its clamp. */
export function atEnd(scalar: Scalar, end: 'low' | 'high'): Scalar {
  const node = scalar.node
  if (node.kind === 'column') {
    const clamp = node.clamped
    if (clamp === null) throw new RangeError('a column without a clamp has no end')
    return { ...scalar, node: { kind: 'constant', text: clamp[end] }, carrier: 'own', nullable: false }
  }
  if (node.kind !== 'apply') return scalar
  return { ...scalar, node: { ...node, args: node.args.map((arg) => atEnd(arg, end)) } }
}
