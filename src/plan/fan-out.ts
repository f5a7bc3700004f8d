import { refuse } from '../base/refusal.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { isNumber } from '../catalog/scalar-type.ts'
import type { Owned } from './owned.ts'
import { type ColumnRef, type Scan, scansIn } from './relation.ts'

/** Rows a person may have after all joins, at the most: beyond it, time would tell. */
const joinedRows = 10_000n
/** Rows a published side may have where it is not joined on a unique key. */
export const listedRows = 100n

export interface FanOut {
  /** Scans with at most one row for each person. */
  readonly determined: ReadonlySet<number>
  /** Private scans whose rows are capped for each person before the join, with the cap; empty where nothing multiplies. */
  readonly capped: ReadonlyMap<number, bigint>
  /** Published scans joined other than on a unique key: each may have `listedRows` rows, which the lobby counts before anything is debited. */
  readonly counted: readonly number[]
  /** Private scans whose rows make the rows of the relation: every other scan has at most one row for each of theirs. */
  readonly leaves: ReadonlySet<number>
  /** Whether a person has at most one row in the whole relation. */
  readonly single: boolean
}

function knownColumn(owned: Owned, known: ReadonlySet<number>, ref: ColumnRef, scans: readonly Scan[], matched: boolean): boolean {
  if (owned.classes.same(ref, owned.person)) return true
  const of = (other: ColumnRef): boolean => known.has(other.scan) || owned.classes.same(other, owned.person)
  for (const scan of scans) {
    if (!known.has(scan.index)) continue
    for (const column of scan.table.columns.keys()) if (owned.classes.same(ref, { scan: scan.index, column })) return true
  }
  if (matched && owned.directed.some(([from, to]) => to.scan === ref.scan && to.column === ref.column && known.has(from.scan))) return true
  return owned.directed.some(([from, to]) => from.scan === ref.scan && from.column === ref.column && of(to))
}

/** Scans that have at most one row once the scans of `known` are fixed; `matched`: among the rows of LEFT JOINs that found a match. */
function close(owned: Owned, known: ReadonlySet<number>, scans: readonly Scan[], matched = false): ReadonlySet<number> {
  const closed = new Set(known)
  for (let changed = true; changed;) {
    changed = false
    for (const scan of scans) {
      if (closed.has(scan.index)) continue
      if (uniqueKeysOf(scan).some((key) => key.every((column) => knownColumn(owned, closed, { scan: scan.index, column }, scans, matched)))) {
        closed.add(scan.index)
        changed = true
      }
    }
  }
  return closed
}

function uniqueKeysOf(scan: Scan): readonly (readonly string[])[] {
  if (scan.table.kind !== 'listed') return scan.table.uniqueKeys
  const [column] = scan.table.columns.keys()
  if (column === undefined) return []
  const source = scan.table.source
  return (source.kind === 'series' ? isRising(source.args) : isDistinct(source.rows.map((row) => row[0]))) ? [[column]] : []
}

/** Whether a series has no value twice: by whole numbers, or by a length of time of one unit (1 month - 30 days can turn back). */
function isRising(args: readonly Scalar[]): boolean {
  const step = args[2]
  if (args.every((arg) => arg.type.family === 'integer')) return true
  return step?.node.kind === 'constant' && /^\s*[1-9]\d{0,5} *(second|minute|hour|day|week|mon|month|year)s?\s*$/i.test(step.node.text ?? '')
}

/** Whether values of a list differ for certain: 1 and 1.0 are two texts of one number. */
function isDistinct(values: readonly (Scalar | undefined)[]): boolean {
  const forms = values.map((value): string | null => {
    if (value?.node.kind !== 'constant' || value.node.text === null) return null
    if (value.type.name === 'text' || value.type.name === 'varchar') return value.node.text
    const range = isNumber(value.type) && value.type.family !== 'float' ? value.range : null
    return range === null ? null : range.low.toString()
  })
  return forms.every((form) => form !== null) && new Set(forms).size === forms.length
}

/** How a person's rows can multiply in the joins, and what keeps that within a static ceiling. */
export function fanOut(owned: Owned): FanOut {
  const scans = [...scansIn(owned.source)]
  const determined = close(owned, new Set(), scans)
  let known = determined
  const leaves: Scan[] = []
  while (known.size < scans.length) {
    const free = scans.filter((scan) => !known.has(scan.index))
    const ranked = free
      .map((scan) => ({ scan, size: close(owned, new Set([...known, scan.index]), scans).size }))
      .sort((a, b) => Number(b.scan.table.kind === 'private') - Number(a.scan.table.kind === 'private') || b.size - a.size)
    const next = ranked[0]?.scan
    if (next === undefined) break
    leaves.push(next)
    known = close(owned, new Set([...known, next.index]), scans)
  }
  const own = leaves.filter((scan) => scan.table.kind === 'private')
  const ownLeaves = new Set(own.map((scan) => scan.index))
  const counted = leaves.filter((scan) => scan.table.kind !== 'private')
  const single = leaves.length === 0
  if (leaves.length <= 1 && counted.length === 0) return { determined, capped: new Map(), counted: [], leaves: ownLeaves, single }
  if (counted.length === 0 && addsUp(owned, own, scans)) return { determined, capped: new Map(), counted: [], leaves: ownLeaves, single }
  const published = listedRows ** BigInt(counted.length)
  const each = root(joinedRows / published, own.length)
  if (counted.length > 2 || (own.length > 0 && each < 4n)) refuse('join.fan-out', { ceiling: listedRows.toString() }, leaves.at(-1)?.at ?? -1)
  const capped = new Map<number, bigint>()
  for (const scan of own) {
    // a cap needs the person in the table itself
    if (scan.table.kind === 'private' && scan.table.owner.kind !== 'column') refuse('join.fan-out', { ceiling: listedRows.toString() }, scan.at)
    capped.set(scan.index, each)
  }
  return { determined, capped, counted: counted.map((scan) => scan.index), leaves: ownLeaves, single: false }
}

/** Whether two leaves meet in a LEFT JOIN in which a row of the one has at most one match in the other: then there are no more rows than both have together. */
function addsUp(owned: Owned, own: readonly Scan[], scans: readonly Scan[]): boolean {
  const [a, b, more] = own
  if (a === undefined || b === undefined || more !== undefined) return false
  const meets = (one: Scan, other: Scan): boolean => close(owned, new Set([one.index]), scans, true).has(other.index)
  return meets(a, b) || meets(b, a)
}

/** The largest whole number whose `power`-th power is at most `value`. */
function root(value: bigint, power: number): bigint {
  if (power === 0) return value
  let n = 1n
  while ((n + 1n) ** BigInt(power) <= value) n += 1n
  return n
}
