import type { CatalogType } from '../catalog/catalog.ts'
import { compareDecimals, isMultiple, isWhole, printDecimal, readDecimal } from './decimal.ts'
import type { Decimal } from './decimal.ts'
import { printDate, printInterval, printMoment, printTime, readDate, readInterval, readMoment, readTime } from './instants.ts'
import { isNumber, numericShape, plainType } from './type.ts'

/** A value of a column's type as a policy may write it. */
export interface Literal {
  /** The one spelling of the value that all spellings of it share, readable by the type's input function under any settings. */
  readonly text: string
  /** Its place in the type's order, null where the policy has no use for the order. */
  readonly order: Decimal | null
}

export type LiteralReading = { readonly kind: 'literal'; readonly literal: Literal } | { readonly kind: 'wrong'; readonly expected: string }

/** Reads a literal strictly; `expected` of a wrong one completes "is not …". */
export function readLiteral(type: CatalogType, written: string): LiteralReading {
  if (type.kind === 'enum')
    return type.labels.includes(written)
      ? read(written)
      : wrong(`one of the labels ${type.labels.slice(0, 12).join(', ')}${type.labels.length > 12 ? ', …' : ''}`)
  if (isNumber(type)) return readNumber(type, written)
  switch (plainType(type)) {
    case 'bool':
      return /^(true|false)$/i.test(written) ? read(written.toLowerCase()) : wrong('true or false')
    case 'date':
      return counted(readDate(written), printDate, 'a date such as 2025-01-31')
    case 'timestamp':
      return counted(
        readMoment(written, false),
        (moment) => printMoment(moment, false),
        'a date or a time of a day without zone, such as 2025-01-31 or 2025-01-31 08:30',
      )
    case 'timestamptz':
      return counted(
        readMoment(written, true),
        (moment) => printMoment(moment, true),
        'a date or a time of a day, in UTC or with an offset, such as 2025-01-31 08:30+01:00',
      )
    case 'time':
      return counted(readTime(written), printTime, 'a time such as 08:30')
    case 'interval':
      return counted(readInterval(written), printInterval, 'a length of time such as 90 minutes, 36:00 or P1DT12H')
    case 'uuid':
      return /^[0-9a-f]{8}(-[0-9a-f]{4}){3}-[0-9a-f]{12}$/i.test(written) ? read(written.toLowerCase()) : wrong('a uuid')
    case 'text':
    case 'varchar':
    case 'bpchar':
      return readText(type, written)
    default:
      return wrong('of a type that literals can be declared for')
  }
}

function readNumber(type: CatalogType, written: string): LiteralReading {
  const value = readDecimal(written)
  if (value === null) return wrong('a plain decimal number')
  const literal = read(printDecimal(value), value)
  switch (plainType(type)) {
    case 'int2':
      return whole(literal, value, 15)
    case 'int4':
      return whole(literal, value, 31)
    case 'int8':
      return whole(literal, value, 63)
    case 'float4':
      return floating(literal, value, floatEnds.float4, 'real')
    case 'float8':
      return floating(literal, value, floatEnds.float8, 'double precision')
    case 'numeric': {
      const shape = numericShape(type)
      if (shape === null) return value.scale <= 1000 ? literal : wrong('a number that numeric can hold')
      const unit: Decimal = shape.scale >= 0 ? { units: 1n, scale: shape.scale } : { units: 10n ** BigInt(-shape.scale), scale: 0 }
      const end: Decimal = { units: unit.units * 10n ** BigInt(shape.precision), scale: unit.scale }
      return isWithin(value, end) && isMultiple(value, unit) ? literal : wrong(`a number that ${type.printed} can hold`)
    }
    default:
      return wrong('a number')
  }
}

const floatEnds = {
  float4: { most: power(34, 37), least: power(1, -37) },
  float8: { most: power(17, 307), least: power(1, -307) },
}

/** Between the type's ends, and not so near 0 that reading it underflows. */
function floating(literal: LiteralReading, value: Decimal, ends: { readonly most: Decimal; readonly least: Decimal }, name: string): LiteralReading {
  const size: Decimal = { units: value.units < 0n ? -value.units : value.units, scale: value.scale }
  const fits = size.units === 0n || (compareDecimals(size, ends.most) <= 0n && compareDecimals(size, ends.least) >= 0n)
  return fits ? literal : wrong(`a number that ${name} can hold`)
}

function whole(literal: LiteralReading, value: Decimal, bits: number): LiteralReading {
  const end: Decimal = { units: 2n ** BigInt(bits), scale: 0 }
  const least: Decimal = { units: -end.units, scale: 0 }
  const fits = isWhole(value) && compareDecimals(value, end) < 0n && compareDecimals(value, least) >= 0n
  return fits ? literal : wrong(`a whole number from ${least.units} to ${end.units - 1n}`)
}

function readText(type: CatalogType, written: string): LiteralReading {
  const value = plainType(type) === 'bpchar' ? written.replace(/ +$/, '') : written
  const length = type.modifier >= 4 ? type.modifier - 4 : null
  if (length !== null && [...value].length > length) return wrong(`at most ${length} characters long, as ${type.printed} demands`)
  return read(value)
}

function counted(count: bigint | null, print: (count: bigint) => string, expected: string): LiteralReading {
  return count === null ? wrong(expected) : read(print(count), { units: count, scale: 0 })
}

function isWithin(value: Decimal, end: Decimal): boolean {
  return compareDecimals({ units: value.units < 0n ? -value.units : value.units, scale: value.scale }, end) < 0n
}

function power(digits: number, exponent: number): Decimal {
  return exponent >= 0 ? { units: BigInt(digits) * 10n ** BigInt(exponent), scale: 0 } : { units: BigInt(digits), scale: -exponent }
}

function read(text: string, order: Decimal | null = null): LiteralReading {
  return { kind: 'literal', literal: { text, order } }
}

function wrong(expected: string): LiteralReading {
  return { kind: 'wrong', expected }
}
