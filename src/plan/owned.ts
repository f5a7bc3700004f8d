import { check } from '../base/check.ts'
import { refuse } from '../base/refusal.ts'
import type { Scalar } from '../catalog/scalar.ts'
import { compare } from '../catalog/functions/comparisons.ts'
import { columnClasses, type ColumnClasses } from './column-classes.ts'
import type { Context } from './context.ts'
import { lowerColumn } from './lower-column.ts'
import { type ColumnRef, equated, indexesIn, isPrivate, type Scan, scansIn, type Source } from './relation.ts'

/** A relation in which every row belongs to one person. */
export interface Owned {
  /** As the vault runs it: owner chains joined in, a published row without a match dropped (it has no person). */
  readonly source: Source
  /** INVARIANT OWNED: the column that says whose row it is; each row is a function of that person's rows and of published data. */
  readonly person: ColumnRef
  readonly classes: ColumnClasses
  /** Equalities that hold for the padded side of a LEFT JOIN only: from its column to the other. */
  readonly directed: readonly (readonly [ColumnRef, ColumnRef])[]
  /** Scans that a published row without a match leaves NULL. */
  readonly paddedScans: ReadonlySet<number>
}

interface Step {
  readonly source: Source
  readonly person: ColumnRef | null
}

/**
 * INVARIANT OWNED is established here: joins of owned relations are accepted only on the person, and `through` tables are joined to the table that says
 * whose they are. `tests` is the WHERE of the block.
 */
export function own(source: Source, tests: readonly Scalar[], context: Context): Owned {
  const builder = { classes: columnClasses(), directed: [] as [ColumnRef, ColumnRef][], padded: new Set<number>(), context }
  learn(tests, builder.classes)
  const expanded = expandOwners(source, context)
  learnFrom(expanded, builder)
  sameRows(expanded, builder.classes)
  const step = walk(expanded, builder)
  check(step.person !== null, 'a block reads a private table')
  return {
    source: { kind: 'filter', input: step.source, tests },
    person: step.person,
    classes: builder.classes,
    directed: builder.directed,
    paddedScans: builder.padded,
  }
}

interface Builder {
  readonly classes: ColumnClasses
  readonly directed: [ColumnRef, ColumnRef][]
  readonly padded: Set<number>
  readonly context: Context
}

function learn(tests: readonly Scalar[], classes: ColumnClasses): void {
  for (const test of tests) {
    const pair = equated(test)
    if (pair !== null) classes.merge(pair[0], pair[1])
  }
}

/** A `through` scan joined to the tables on its way to the person. */
function expandOwners(source: Source, context: Context): Source {
  switch (source.kind) {
    case 'filter':
      return { ...source, input: expandOwners(source.input, context) }
    case 'join':
      return { ...source, left: expandOwners(source.left, context), right: expandOwners(source.right, context) }
    case 'scan':
      return chain(source.scan, context)
  }
}

/** The scan joined along its owner chain to the table that names the person. */
function chain(scan: Scan, context: Context): Source {
  const table = scan.table
  let source: Source = { kind: 'scan', scan }
  if (table.kind !== 'private' || table.owner.kind === 'column') return source
  let from = scan
  for (const step of table.owner.steps) {
    const next = context.dataSet.tables.get(step.table)
    check(next?.kind === 'private', 'an owner chain leads through private tables')
    const hidden: Scan = { index: context.scans.length, table: next, at: scan.at }
    context.scans.push(hidden)
    const on = compare('=', columnAt(from, step.column), columnAt(hidden, step.referenced), scan.at)
    source = { kind: 'join', type: 'inner', left: source, right: { kind: 'scan', scan: hidden }, on: [on], at: scan.at }
    from = hidden
  }
  return source
}

function columnAt(scan: Scan, name: string): Scalar {
  const column = scan.table.columns.get(name)
  check(column !== undefined, `table has the column ${name}`)
  return lowerColumn(scan.index, column, scan.at)
}

/** The column that names the person of a private scan whose chain ends in itself. */
function ownPerson(scan: Scan): ColumnRef | null {
  return scan.table.kind === 'private' && scan.table.owner.kind === 'column' ? { scan: scan.index, column: scan.table.owner.column } : null
}

/** What the joins say is equal: on every row for an inner join (and for a published row's LEFT JOIN, whose unmatched rows are dropped), on matched rows only otherwise. */
function learnFrom(source: Source, builder: Builder): void {
  switch (source.kind) {
    case 'scan':
      return
    case 'filter':
      learn(source.tests, builder.classes)
      learnFrom(source.input, builder)
      return
    case 'join': {
      learnFrom(source.left, builder)
      learnFrom(source.right, builder)
      const padding = source.type === 'left' && !isPrivate(source.left) && isPrivate(source.right)
      if (source.type === 'inner' || padding) return learn(source.on, builder.classes)
      const inside = indexesIn(source.right)
      for (const test of source.on) {
        const pair = equated(test)
        if (pair === null) continue
        const [a, b] = pair
        if (inside.has(a.scan) && !inside.has(b.scan)) builder.directed.push([a, b])
        else if (inside.has(b.scan) && !inside.has(a.scan)) builder.directed.push([b, a])
      }
    }
  }
}

/** Two scans of one table that agree on a unique column are the same row, so they have the same owner. */
function sameRows(source: Source, classes: ColumnClasses): void {
  const scans = [...scansIn(source)]
  for (let changed = true; changed;) {
    changed = false
    for (const a of scans)
      for (const b of scans) {
        if (a.index >= b.index || a.table.kind !== 'private' || a.table !== b.table) continue
        const agree = a.table.uniqueKeys.some((key) => key.every((column) => classes.same({ scan: a.index, column }, { scan: b.index, column })))
        if (!agree) continue
        for (const column of a.table.columns.keys()) changed = classes.merge({ scan: a.index, column }, { scan: b.index, column }) || changed
      }
  }
}

function walk(source: Source, builder: Builder): Step {
  switch (source.kind) {
    case 'scan':
      return { source, person: ownPerson(source.scan) }
    case 'filter': {
      const input = walk(source.input, builder)
      return { source: { ...source, input: input.source }, person: input.person }
    }
    case 'join':
      return join(source, builder)
  }
}

function join(source: Extract<Source, { kind: 'join' }>, builder: Builder): Step {
  const [left, right] = [walk(source.left, builder), walk(source.right, builder)]
  const joined: Source = { ...source, left: left.source, right: right.source }
  if (left.person === null && right.person === null) return isPrivate(source) ? { source: joined, person: chainEnd(source) } : { source: joined, person: null }
  if (right.person === null) {
    // the end of an owner chain carries the person of the whole chain
    return { source: joined, person: left.person }
  }
  if (left.person === null) {
    if (!isPrivate(source.left)) {
      if (source.type === 'left') for (const index of indexesIn(source.right)) builder.padded.add(index)
      return { source: { ...joined, type: 'inner' }, person: right.person }
    }
    return { source: joined, person: right.person }
  }
  if (!samePerson(left.person, right.person, source, builder)) {
    refuse('join.person', { left: nameOf(left.person, source), right: nameOf(right.person, source), person: builder.context.dataSet.personCalled }, source.at)
  }
  return { source: joined, person: left.person }
}

function chainEnd(source: Source): ColumnRef | null {
  for (const scan of scansIn(source)) {
    const person = ownPerson(scan)
    if (person !== null) return person
  }
  return null
}

/** Whether the join makes both sides' rows one person's: by what holds on every row, or by its own condition on matched rows. */
function samePerson(a: ColumnRef, b: ColumnRef, source: Extract<Source, { kind: 'join' }>, builder: Builder): boolean {
  if (builder.classes.same(a, b)) return true
  if (source.type !== 'left') return false
  const matched = columnClasses()
  learn(source.on, matched)
  const first = new Map<string, ColumnRef>()
  for (const scan of scansIn(source))
    for (const column of scan.table.columns.keys()) {
      const ref = { scan: scan.index, column }
      const name = builder.classes.find(ref)
      const known = first.get(name)
      if (known === undefined) first.set(name, ref)
      else matched.merge(known, ref)
    }
  // a matched row has a row of every scan that its condition equates, so what holds on rows of that scan holds here
  const present = new Set(source.on.flatMap((test) => (equated(test) ?? []).map((ref) => ref.scan)))
  for (const [from, to] of builder.directed) if (present.has(from.scan)) matched.merge(from, to)
  sameRows(source, matched)
  return matched.same(a, b)
}

function nameOf(ref: ColumnRef, source: Source): string {
  for (const scan of scansIn(source)) if (scan.index === ref.scan) return scan.table.name
  return 'a private table'
}
