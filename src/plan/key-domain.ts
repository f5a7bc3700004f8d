import { atEnd, isBetweenEnds } from '../catalog/functions/times.ts'
import { isClamped } from '../catalog/functions/clamped.ts'
import type { Scalar } from '../catalog/scalar.ts'
import type { DataColumn } from '../policy/data-set.ts'
import type { ListFactor } from './release-plan.ts'
import type { Scan } from './relation.ts'

/** The list of values a key can take, as far as policy and text declare one; null where it would have to be chosen from the data. */
export function domainOf(scalar: Scalar, key: number, scans: readonly Scan[]): ListFactor | null {
  const texts = textsOf(scalar, scans)
  if (texts !== null) return { kind: 'texts', key, type: scalar.type, texts: withNull(texts, scalar.nullable) }
  const node = scalar.node
  if (node.kind === 'column') {
    const column = columnOf(node.scan, node.column, scans)
    const from = column?.valuesFrom ?? null
    return from === null ? null : { kind: 'column', key, table: from.table, column: from.column, nullable: scalar.nullable }
  }
  if (node.kind === 'apply' && (node.form === 'date-trunc' || node.form === 'extract') && isClamped(scalar) && isBetweenEnds(scalar))
    return steps(scalar, node, key)
  return castOfInstants(scalar, key, scans)
}

/** date_trunc('month', a)::date and the like: the list of what is cast, each value cast. */
function castOfInstants(scalar: Scalar, key: number, scans: readonly Scan[]): ListFactor | null {
  const arg = scalar.node.kind === 'apply' && scalar.node.form === 'cast' ? scalar.node.args[0] : undefined
  if (arg?.node.kind !== 'apply' || arg.node.form !== 'date-trunc' || !instants.has(scalar.type.family)) return null
  const list = domainOf(arg, key, scans)
  return list?.kind === 'instants' ? { ...list, type: scalar.type } : null
}

const instants: ReadonlySet<string> = new Set(['date', 'timestamp', 'timestamptz'])

type Apply = Extract<Scalar['node'], { kind: 'apply' }>

const fixedFields: Readonly<Record<string, readonly [string, string]>> = {
  minute: ['0', '59'],
  hour: ['0', '23'],
  day: ['1', '31'],
  dow: ['0', '6'],
  isodow: ['1', '7'],
  doy: ['1', '366'],
  week: ['1', '53'],
  month: ['1', '12'],
  quarter: ['1', '4'],
}

function steps(scalar: Scalar, node: Apply, key: number): ListFactor {
  const [unit = ''] = node.words
  const [low, high] = [atEnd(scalar, 'low'), atEnd(scalar, 'high')]
  if (node.form === 'date-trunc') return { kind: 'instants', key, type: scalar.type, low, high, unit, nullable: scalar.nullable }
  const fixed = fixedFields[unit]
  const end = (text: string): Scalar => ({ ...scalar, node: { kind: 'constant', text }, nullable: false, range: null })
  return {
    kind: 'numbers',
    key,
    type: scalar.type,
    low: fixed === undefined ? low : end(fixed[0]),
    high: fixed === undefined ? high : end(fixed[1]),
    nullable: scalar.nullable,
  }
}

/** Values known as texts: declared ones, booleans, and what CASE and coalesce make of constants and declared ones. */
function textsOf(scalar: Scalar, scans: readonly Scan[]): readonly string[] | null {
  if (scalar.type.family === 'bool') return ['true', 'false']
  const node = scalar.node
  if (node.kind === 'constant') return node.text === null ? [] : [node.text]
  if (node.kind === 'column') return columnOf(node.scan, node.column, scans)?.values ?? null
  if (node.kind !== 'apply' || (node.form !== 'case' && node.form !== 'coalesce')) return null
  const results = node.form === 'coalesce' ? node.args : node.args.filter((_, i) => i % 2 === 1 || (i === node.args.length - 1 && node.args.length % 2 === 1))
  const texts = new Set<string>()
  for (const result of results) {
    const some = textsOf(result, scans)
    if (some === null) return null
    for (const text of some) texts.add(text)
  }
  return [...texts]
}

function withNull(texts: readonly string[], nullable: boolean): readonly (string | null)[] {
  return nullable ? [...texts, null] : texts
}

export function columnOf(scan: number, name: string, scans: readonly Scan[]): DataColumn | null {
  return scans.find((each) => each.index === scan)?.table.columns.get(name) ?? null
}
