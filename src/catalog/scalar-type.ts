import type { CatalogType } from './catalog.ts'

export type Family =
  | 'bool'
  | 'integer'
  | 'numeric'
  | 'float'
  | 'text'
  | 'date'
  | 'timestamp'
  | 'timestamptz'
  | 'time'
  | 'interval'
  | 'uuid'
  | 'enum'
  | 'unknown'
  | 'opaque'

/** A type that an expression over private rows may have. */
export interface ScalarType {
  readonly schema: string
  readonly name: string // pg_type.typname
  readonly family: Family
}

const families: Readonly<Record<string, Family>> = {
  bool: 'bool',
  int2: 'integer',
  int4: 'integer',
  int8: 'integer',
  numeric: 'numeric',
  float4: 'float',
  float8: 'float',
  text: 'text',
  varchar: 'text',
  bpchar: 'text',
  date: 'date',
  timestamp: 'timestamp',
  timestamptz: 'timestamptz',
  time: 'time',
  interval: 'interval',
  uuid: 'uuid',
  unknown: 'unknown',
}

/** The type of that name in pg_catalog; a name we do not know is our own bug in a table of ours. */
export function scalarType(name: string): ScalarType {
  const family = families[name]
  if (family === undefined) throw new RangeError(`no scalar type ${name}`)
  return { schema: 'pg_catalog', name, family }
}

/** A column's type as an expression sees it, or null where an expression may only ask whether it is NULL. */
export function scalarTypeOf(type: CatalogType): ScalarType | null {
  if (type.kind === 'enum') return { schema: type.schema, name: type.name, family: 'enum' }
  if (type.kind !== 'base' || type.schema !== 'pg_catalog') return null
  return namedType(type.name)
}

/** The scalar type of that name in pg_catalog, or null where an expression has none of that name. */
export function namedType(name: string): ScalarType | null {
  const family = Object.hasOwn(families, name) ? families[name] : undefined
  return family === undefined || family === 'unknown' ? null : { schema: 'pg_catalog', name, family }
}

/** A type whose values are counted or tested for NULL, and nothing else: json, arrays, domains and the like. */
export function opaqueType(type: CatalogType): ScalarType {
  return { schema: type.schema, name: type.name, family: 'opaque' }
}

const printedNames: Readonly<Record<string, string>> = {
  boolean: 'bool',
  smallint: 'int2',
  integer: 'int4',
  bigint: 'int8',
  real: 'float4',
  'double precision': 'float8',
  'character varying': 'varchar',
  character: 'bpchar',
  'timestamp without time zone': 'timestamp',
  'timestamp with time zone': 'timestamptz',
  'time without time zone': 'time',
}

/** An array of a scalar type, named as PostgreSQL names it, for parameters: an expression may only look into it by ANY. */
function arrayType(printed: string): ScalarType | null {
  const element = printed.endsWith('[]') ? printedType(printed.slice(0, -2)) : null
  return element === null ? null : { schema: 'pg_catalog', name: `_${element.name}`, family: 'opaque' }
}

/** The type of a parameter that format_type prints as `printed`: a scalar of pg_catalog or an array of one; null for any other. */
export function printedParameter(printed: string): ScalarType | null {
  return printedType(printed) ?? arrayType(printed)
}

/** The type that format_type prints as `printed` (modifiers dropped), or null where it is none of pg_catalog's scalars. */
export function printedType(printed: string): ScalarType | null {
  const bare = printed.replace(/\(\d+(,-?\d+)?\)/, '')
  const name = printedNames[bare] ?? bare
  const family = families[name]
  return family === undefined ? null : { schema: 'pg_catalog', name, family }
}

export function sameType(a: ScalarType, b: ScalarType): boolean {
  return a.schema === b.schema && a.name === b.name
}

/** The order in which PostgreSQL promotes numbers. */
const ranks: readonly string[] = ['int2', 'int4', 'int8', 'numeric', 'float4', 'float8']

export function isNumber(type: ScalarType): boolean {
  return type.family === 'integer' || type.family === 'numeric' || type.family === 'float'
}

/** What PostgreSQL makes of two numbers under + - * /: the wider type, and float8 wherever a float meets another type. */
export function promote(a: ScalarType, b: ScalarType): ScalarType {
  if (sameType(a, b)) return a
  if (a.family === 'float' || b.family === 'float') return scalarType('float8')
  return ranks.indexOf(a.name) >= ranks.indexOf(b.name) ? a : b
}
