import type { CatalogType } from '../catalog/catalog.ts'

const numbers: ReadonlySet<string> = new Set(['int2', 'int4', 'int8', 'numeric', 'float4', 'float8'])
const ordered: ReadonlySet<string> = new Set([...numbers, 'date', 'timestamp', 'timestamptz', 'time', 'interval'])
const usable: ReadonlySet<string> = new Set([...ordered, 'bool', 'text', 'varchar', 'bpchar', 'uuid'])
const identifying: ReadonlySet<string> = new Set(['int2', 'int4', 'int8', 'numeric', 'text', 'varchar', 'uuid'])

/** The name of a type of PostgreSQL's own that values can be declared for; null for every other type, a look-alike in another schema included. */
export function plainType(type: CatalogType): string | null {
  return type.kind === 'base' && type.schema === 'pg_catalog' && usable.has(type.name) ? type.name : null
}

/** Whether a column of the type may carry declarations on private rows. */
export function isUsable(type: CatalogType): boolean {
  return type.kind === 'enum' || plainType(type) !== null
}

export function isNumber(type: CatalogType): boolean {
  return numbers.has(plainType(type) ?? '')
}

/** Whether a clamp makes sense: the values have an order, and a distance. */
export function isOrdered(type: CatalogType): boolean {
  return ordered.has(plainType(type) ?? '')
}

/** Whether equal values of the type print alike, so that a person's key can be told by its text: numeric needs a fixed scale for that. */
export function canIdentify(type: CatalogType): boolean {
  const name = plainType(type)
  return name !== null && identifying.has(name) && (name !== 'numeric' || numericShape(type) !== null)
}

/** Whether a column of type `a` may hold the person key of type `b`: the same type, and for numeric the same scale. */
export function sameKeyType(a: CatalogType, b: CatalogType): boolean {
  if (a.schema !== b.schema || a.name !== b.name) return false
  return a.name !== 'numeric' || numericShape(a)?.scale === numericShape(b)?.scale
}

/** numeric(p,s) from its type modifier: scale lies in the low 11 bits, signed since PostgreSQL 15; null for plain numeric. */
export function numericShape(type: CatalogType): { readonly precision: number; readonly scale: number } | null {
  if (plainType(type) !== 'numeric' || type.modifier < 4) return null
  const packed = type.modifier - 4
  return { precision: (packed >> 16) & 0xffff, scale: ((packed & 0x7ff) ^ 1024) - 1024 }
}
