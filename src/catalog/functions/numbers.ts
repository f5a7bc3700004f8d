import { Fraction } from '../../base/fraction.ts'
import { refuse } from '../../base/refusal.ts'
import type { Range, Scalar } from '../scalar.ts'
import { isNumber, promote, scalarType, type ScalarType } from '../scalar-type.ts'
import { apply } from './apply.ts'
import type { FormName } from './forms.ts'

const two62 = Fraction.make(2n ** 62n)
const two31 = Fraction.make(2n ** 31n)
const half = Fraction.make(1n, 2n)
const floatGrid = Fraction.make(1n, 10n ** 290n)
const roundedUp = Fraction.make(10n ** 12n + 1n, 10n ** 12n)
/** Bits of a bound's numerator and denominator: far below the digits at which numeric overflows or rounds a product, whatever the rows hold. */
const boundBits = 4000n

function largest(range: Range): Fraction {
  const low = range.low.isLess(Fraction.zero) ? range.low.neg() : range.low
  const high = range.high.isLess(Fraction.zero) ? range.high.neg() : range.high
  return low.max(high)
}

function hull(values: readonly Fraction[], step: Fraction | null): Range {
  const [first = Fraction.zero, ...rest] = values
  return { low: rest.reduce((a, b) => a.min(b), first), high: rest.reduce((a, b) => a.max(b), first), step }
}

/** The finest grid that holds multiples of both. */
export function commonStep(a: Fraction | null, b: Fraction | null): Fraction | null {
  if (a === null || b === null) return null
  if (a.isZero()) return b
  if (b.isZero()) return a
  let [x, y] = [a, b]
  while (!y.isZero()) [x, y] = [y, x.sub(y.mul(Fraction.make(x.div(y).floor())))]
  return x
}

/** The proved range of a number, or a refusal that asks for a clamp. */
export function rangeOf(scalar: Scalar): Range {
  return scalar.range ?? refuse('expr.unbounded', { expression: describe(scalar) }, scalar.at)
}

function describe(scalar: Scalar): string {
  const column = scalar.node.kind === 'column' ? scalar.node.column : null
  return column === null ? 'this value' : `"${column}"`
}

function cast(arg: Scalar, to: 'int8' | 'numeric'): Scalar {
  const cast = apply('cast', [arg], arg.type, { words: ['pg_catalog', to], range: arg.range, at: arg.at })
  return { ...cast, carrier: to }
}

/** The value as an expression of type numeric. */
export function asNumeric(arg: Scalar): Scalar {
  if (arg.carrier === 'numeric' || (arg.carrier === 'own' && arg.type.family === 'numeric')) return arg
  return cast(arg, 'numeric')
}

/** The value in numeric, standing for one of another type; a column keeps its own type below, by which its clamp is printed. */
function standing(arg: Scalar, type: ScalarType, carrier: Scalar['carrier'], at: number): Scalar {
  const exact = asNumeric(arg)
  return { ...(exact.node.kind === 'column' ? cast(exact, 'numeric') : exact), type, carrier, at }
}

function asInt8(arg: Scalar): Scalar {
  if (arg.carrier === 'int8' || (arg.carrier === 'own' && arg.type.name === 'int8')) return arg
  return cast(arg, 'int8')
}

function isInteger(scalar: Scalar): boolean {
  return scalar.type.family === 'integer'
}

/** An operation on numbers: its operands brought to a type in which the proved result fits. */
function compute(form: FormName, args: readonly Scalar[], type: ScalarType, range: Range, at: number, words: readonly string[] = []): Scalar {
  for (const end of [range.low, range.high, range.step ?? Fraction.zero])
    if (end.n >> boundBits > 1n || end.n >> boundBits < -1n || end.d >> boundBits > 0n) refuse('expr.unbounded', { expression: 'this value' }, at)
  const size = args.reduce((most, arg) => most.max(largest(rangeOf(arg))), largest(range))
  if (type.family === 'integer' && args.every(isInteger)) {
    const narrow = type.name !== 'int2' && size.isLess(two31) && args.every((arg) => arg.carrier === 'own' && arg.type.name !== 'int2')
    if (narrow) return apply(form, args, type, { range, at, words })
    if (size.isLess(two62)) return { ...apply(form, args.map(asInt8), type, { range, at, words }), carrier: 'int8' }
    if (form === 'divide' || form === 'modulo') refuse('expr.unbounded', { expression: 'this division' }, at)
  }
  return { ...apply(form, args.map(asNumeric), type, { range, at, words }), carrier: 'numeric' }
}

/** a + b, a - b, a * b, a / b, a % b over two numbers. */
export function arithmetic(sign: '+' | '-' | '*' | '/' | '%', left: Scalar, right: Scalar, at: number): Scalar {
  const type = promote(left.type, right.type)
  const [a, b] = [rangeOf(left), rangeOf(right)]
  switch (sign) {
    case '+':
      return compute('add', [left, right], type, { low: a.low.add(b.low), high: a.high.add(b.high), step: commonStep(a.step, b.step) }, at)
    case '-':
      return compute('subtract', [left, right], type, { low: a.low.sub(b.high), high: a.high.sub(b.low), step: commonStep(a.step, b.step) }, at)
    case '*': {
      const corners = [a.low.mul(b.low), a.low.mul(b.high), a.high.mul(b.low), a.high.mul(b.high)]
      return compute('multiply', [left, right], type, hull(corners, a.step === null || b.step === null ? null : a.step.mul(b.step)), at)
    }
    case '/': {
      const least = smallest(b, right)
      const quotient = largest(a).div(least)
      // numeric division rounds, to 16 significant digits at the least: just below a half it may give the half
      const size = type.family === 'integer' ? quotient : quotient.mul(roundedUp)
      if (type.family === 'integer') {
        const whole = Fraction.make(size.floor())
        const low = a.low.isLess(Fraction.zero) || b.low.isLess(Fraction.zero) ? whole.neg() : Fraction.zero
        return { ...compute('divide', [left, right], type, { low, high: whole, step: Fraction.one }, at), nullable: true }
      }
      const low = a.low.isLess(Fraction.zero) || b.low.isLess(Fraction.zero) ? size.neg() : Fraction.zero
      return { ...compute('divide', [left, right], type, { low, high: size, step: null }, at), nullable: true }
    }
    case '%': {
      if (type.family !== 'integer') return refuse('expr.unsupported', { what: `% over ${type.name}` }, at)
      const size = largest(b)
      return {
        ...compute('modulo', [left, right], type, { low: a.low.isLess(Fraction.zero) ? size.neg() : Fraction.zero, high: size, step: Fraction.one }, at),
        nullable: true,
      }
    }
  }
}

/** The smallest size a divisor can have once zero is NULL. */
function smallest(range: Range, scalar: Scalar): Fraction {
  if (range.low.isPositive()) return range.low
  if (range.high.isLess(Fraction.zero)) return range.high.neg()
  if (range.step !== null && range.step.isPositive()) return range.step
  return refuse('expr.unbounded', { expression: describe(scalar) }, scalar.at)
}

export function negate(arg: Scalar, at: number): Scalar {
  const range = rangeOf(arg)
  return compute('negate', [arg], arg.type, { low: range.high.neg(), high: range.low.neg(), step: range.step }, at)
}

export function absolute(arg: Scalar, at: number): Scalar {
  const range = rangeOf(arg)
  const low = range.low.isPositive() ? range.low : range.high.isLess(Fraction.zero) ? range.high.neg() : Fraction.zero
  return compute('abs', [arg], arg.type, { low, high: largest(range), step: range.step }, at)
}

/** floor, ceil, round, trunc and sign; PostgreSQL gives float8 for an integer or a float, numeric for numeric. */
export function rounded(form: 'floor' | 'ceil' | 'round' | 'trunc' | 'sign', arg: Scalar, places: number, at: number): Scalar {
  const range = rangeOf(arg)
  const type = arg.type.family === 'numeric' ? arg.type : scalarType('float8')
  const unit = Fraction.make(1n, 10n ** BigInt(places))
  const words = form === 'round' || form === 'trunc' ? [places.toString()] : []
  const toGrid = (value: Fraction, up: boolean): Fraction => {
    const units = value.div(unit)
    return Fraction.make(up ? units.ceil() : units.floor()).mul(unit)
  }
  const bound: Range =
    form === 'sign'
      ? { low: Fraction.one.neg(), high: Fraction.one, step: Fraction.one }
      : { low: toGrid(range.low, false), high: toGrid(range.high, true), step: unit }
  return { ...apply(form, [asNumeric(arg)], type, { range: bound, at, words }), carrier: 'numeric' }
}

/** A number cast to another number type; only where the proved range shows that it fits. */
export function castNumber(arg: Scalar, to: ScalarType, at: number): Scalar {
  const limits: Readonly<Record<string, Fraction>> = { int2: Fraction.make(32767n), int4: Fraction.make(2147483647n), int8: two62 }
  const limit = limits[to.name]
  if (limit !== undefined) {
    const widening = arg.carrier === 'own' && arg.type.family === 'integer' && (to.name === 'int8' || arg.type.name === to.name || arg.type.name === 'int2')
    if (!widening && !largest(rangeOf(arg)).add(half).isAtMost(limit)) refuse('expr.unbounded', { expression: describe(arg) }, arg.at)
    if (widening) return apply('cast', [arg], to, { words: ['pg_catalog', to.name], range: arg.range, at })
    // PostgreSQL rounds a numeric to the nearest, halves away from zero
    const range = rangeOf(arg)
    const bounds = { low: Fraction.make(range.low.sub(half).ceil()), high: Fraction.make(range.high.add(half).floor()), step: Fraction.one }
    const whole =
      arg.type.family === 'integer' ? arg : { ...apply('round', [asNumeric(arg)], arg.type, { range: bounds, at, words: ['0'] }), carrier: 'numeric' as const }
    return apply('cast', [whole], to, { words: ['pg_catalog', to.name], range: arg.type.family === 'integer' ? range : bounds, at })
  }
  if (to.family === 'numeric') {
    if (arg.type.family === 'float') rangeOf(arg)
    return standing(arg, to, 'own', at)
  }
  // to a float: exact numbers with a proved range, kept in numeric so that sums stay exact
  if (arg.type.family === 'float' && arg.carrier === 'own' && arg.range === null)
    return apply('cast', [arg], to.name === 'float8' ? to : refuse('expr.unsupported', { what: 'a cast to real' }, at), {
      words: ['pg_catalog', 'float8'],
      range: null,
      at,
    })
  if (arg.type.family === 'integer' && arg.range === null) return apply('cast', [arg], to, { words: ['pg_catalog', to.name], range: null, at })
  rangeOf(arg)
  return standing(arg, to, 'numeric', at)
}

/** Two numbers brought together for a comparison: what prints as numeric beside a float is cast to one, which must neither overflow nor vanish. */
export function comparable(left: Scalar, right: Scalar): readonly [Scalar, Scalar] {
  if (!isNumber(left.type) || !isNumber(right.type)) return [left, right]
  const [a, b] = [printsAs(left), printsAs(right)]
  return a !== b && (a === 'float' || b === 'float') ? [besideFloat(left), besideFloat(right)] : [left, right]
}

/** Cut to 290 places where no grid is proved: what is left of a tiny value is zero, and zero is cast without complaint. */
function besideFloat(side: Scalar): Scalar {
  if (printsAs(side) !== 'numeric') return side
  // NaN and the infinities have no range and fit; any other value of the statement's own is held to the same edges, since the vault casts it
  if (side.node.kind === 'constant' && (side.node.text === null || !/\d/.test(side.node.text))) return side
  const gridded =
    rangeOf(side).step === null
      ? { ...apply('round', [side], side.type, { range: { ...rangeOf(side), step: floatGrid }, at: side.at, words: ['290'] }), carrier: side.carrier }
      : side
  fitsFloat(gridded, 'float8')
  return gridded
}

function printsAs(scalar: Scalar): 'integer' | 'numeric' | 'float' {
  if (scalar.carrier !== 'own') return scalar.carrier === 'numeric' ? 'numeric' : 'integer'
  return scalar.type.family === 'float' ? 'float' : scalar.type.family === 'numeric' ? 'numeric' : 'integer'
}

/** Refuses a numeric whose cast to the float could raise: a value too large for it, or one so small that it would be taken for zero. */
export function fitsFloat(scalar: Scalar, to: 'float4' | 'float8'): void {
  const edge = Fraction.make(10n ** (to === 'float4' ? 30n : 290n))
  const { step } = rangeOf(scalar)
  if (!largest(rangeOf(scalar)).isAtMost(edge) || step === null || (step.isPositive() && step.isLess(Fraction.one.div(edge))))
    refuse('expr.unbounded', { expression: describe(scalar) }, scalar.at)
}
