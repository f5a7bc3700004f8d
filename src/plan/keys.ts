import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import { parts, scansOf, type Scalar } from '../catalog/scalar.ts'
import { isNumber, scalarType } from '../catalog/scalar-type.ts'
import { settle } from '../catalog/functions/comparisons.ts'
import { fitsFloat } from '../catalog/functions/numbers.ts'
import { columnOf, domainOf } from './key-domain.ts'
import type { Key, ListFactor } from './release-plan.ts'
import type { FanOut } from './fan-out.ts'
import { indexesIn, isPrivate, paddedScans, type Scan, type Source } from './relation.ts'

/** A key as it is grouped by. Refused: what names a person, and types whose equal values print apart. */
export function keyOf(scalar: Scalar, scans: readonly Scan[]): Key {
  const settled = settle(scalar, scalarType('text'))
  for (const part of parts(settled)) {
    if (part.node.kind !== 'column') continue
    const column = columnOf(part.node.scan, part.node.column, scans)
    if (column?.role === 'linking' && isPrivateScan(part.node.scan, scans)) refuse('rows.person', { column: column.name }, part.at)
    if (column !== null && !column.deterministic) refuse('keys.form', { type: `${column.type.printed} under its collation` }, part.at)
  }
  if (settled.type.family === 'interval' || settled.type.family === 'opaque') refuse('keys.form', { type: settled.type.name }, scalar.at)
  if (isNumber(settled.type) && settled.carrier !== 'own') fits(settled)
  return { scalar: settled, type: settled.type }
}

const limits: Readonly<Record<string, bigint>> = { int2: 2n ** 15n - 1n, int4: 2n ** 31n - 1n, int8: 2n ** 62n }

/** A key computed in a wider type must fit its own. */
function fits(scalar: Scalar): void {
  if (scalar.type.name === 'float4' || scalar.type.name === 'float8') return fitsFloat(scalar, scalar.type.name)
  const limit = limits[scalar.type.name]
  if (limit === undefined) return
  const range = scalar.range
  if (range === null || !range.high.isAtMost(Fraction.make(limit)) || range.low.isLess(Fraction.make(-limit)))
    refuse('expr.unbounded', { expression: 'this key' }, scalar.at)
}

function isPrivateScan(index: number, scans: readonly Scan[]): boolean {
  return scans.find((scan) => scan.index === index)?.table.kind === 'private'
}

interface Component {
  readonly source: Source
  readonly scans: ReadonlySet<number>
  readonly tests: readonly Scalar[]
  readonly padded: boolean
}

/** The maximal parts of FROM that read published data only, each with the conditions on it alone. */
function components(source: Source, tests: readonly Scalar[], padded: boolean): readonly Component[] {
  if (!isPrivate(source)) {
    const scans = indexesIn(source)
    return [{ source, scans, tests: tests.filter((test) => within(test, scans)), padded }]
  }
  switch (source.kind) {
    case 'scan':
      return []
    case 'filter':
      return components(source.input, [...tests, ...source.tests], padded)
    case 'join': {
      const inside = source.type === 'inner' ? [...tests, ...source.on] : tests
      const rightPadded = padded || (source.type === 'left' && isPrivate(source.left))
      return [...components(source.left, inside, padded), ...components(source.right, source.type === 'inner' ? inside : [...tests, ...source.on], rightPadded)]
    }
  }
}

function within(test: Scalar, scans: ReadonlySet<number>): boolean {
  const used = scansOf(test)
  return used.size > 0 && [...used].every((scan) => scans.has(scan))
}

/**
 * The lists whose cross product is every group, or null where some key has none. A key made of published columns is listed from the published part of the
 * FROM itself: that is how an analyst names the groups they want.
 */
export function listsOf(keys: readonly Key[], source: Source, tests: readonly Scalar[], scans: readonly Scan[]): readonly ListFactor[] | null {
  const parts = components(source, tests, false)
  const factors: ListFactor[] = []
  const byComponent = new Map<Component, number[]>()
  for (const [index, key] of keys.entries()) {
    const used = scansOf(key.scalar)
    const component = parts.find((part) => used.size > 0 && [...used].every((scan) => part.scans.has(scan)))
    if (component !== undefined) {
      byComponent.set(component, [...(byComponent.get(component) ?? []), index])
      continue
    }
    const domain = domainOf(key.scalar, index, scans)
    if (domain === null) return null
    factors.push(domain)
  }
  for (const [component, indexes] of byComponent)
    factors.push({ kind: 'component', keys: indexes, source: component.source, tests: component.tests, padded: component.padded })
  return factors
}

/**
 * Whether every key is a function of what a person has only once, so that each person is in one group by nature. Where a person has several rows, a scan of
 * the padded side of a LEFT JOIN is NULL on some of them and a row on others: that is two groups.
 */
export function isOneGroupByNature(keys: readonly Key[], spread: FanOut, source: Source): boolean {
  if (spread.single) return true
  const padded = paddedScans(source)
  return keys.every((key) => [...scansOf(key.scalar)].every((scan) => spread.determined.has(scan) && !padded.has(scan)))
}
