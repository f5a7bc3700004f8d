import { isFields, placeFields } from './raw.ts'
import type { Json } from './raw.ts'

/** Whether two trees of the parser say the same, places aside. Numbers, texts and the order of lists are compared exactly. */
export function sameRaw(a: Json | undefined, b: Json | undefined): boolean {
  if (a === b) return true
  if (Array.isArray(a)) return Array.isArray(b) && a.length === b.length && a.every((item, index) => sameRaw(item as Json, b[index] as Json))
  if (!isFields(a) || !isFields(b)) return false
  const names = said(a)
  return names.length === said(b).length && names.every((name) => Object.hasOwn(b, name) && sameRaw(a[name], b[name]))
}

function said(fields: { readonly [field: string]: Json }): readonly string[] {
  return Object.keys(fields).filter((name) => !(placeFields.has(name) && typeof fields[name] === 'number'))
}
