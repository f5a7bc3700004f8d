import { cellOf, type Cell, type Kind, personPools } from './odd-values.ts'
import type { Random } from './random.ts'

/** A column as the generators know it. */
export interface FuzzColumn {
  readonly name: string
  readonly kind: Kind | 'person' | 'serial' | 'reference'
  readonly nullable: boolean
  /** Whether the policy declares a clamp. */
  readonly clamped: boolean
}

export interface FuzzTable {
  readonly name: string
  readonly columns: readonly FuzzColumn[]
  readonly constraints: string
  /** SQL that is true of the rows of person $p, over columns of this table; null for a published table. `{s}` is the schema. */
  readonly ownedBy: string | null
  /** SQL that is true of rows without a person. */
  readonly ownedByNobody: string | null
}

/** What a world varies: the type of the person's key, and whether rows may lack their person. */
export interface World {
  readonly person: string
  readonly orphans: boolean
}

export const worlds: readonly World[] = Object.keys(personPools).flatMap((person) => [
  { person, orphans: true },
  { person, orphans: false },
])

const column = (name: string, kind: FuzzColumn['kind'], clamped = false, nullable = true): FuzzColumn => ({ name, kind, clamped, nullable })

/** The invented ferry company again, with a column of every type, and owners by column, through one key and through two. */
export function tablesOf(world: World): readonly FuzzTable[] {
  const own = (nullable: boolean): FuzzColumn => column('rider_id', 'person', false, nullable)
  const mine = 'rider_id = $p'
  const trip = (test: string): string => `trip_id IN (SELECT trip_id FROM {s}.trips WHERE ${test})`
  const complaint = (test: string): string => `complaint_id IN (SELECT complaint_id FROM {s}.complaints WHERE ${trip(test)})`
  return [
    {
      name: 'riders',
      columns: [
        own(false),
        column('birth_year', 'int2', true),
        column('district', 'text'),
        column('nick', 'varchar'),
        column('code', 'bpchar'),
        column('score', 'float8', true),
        column('joined', 'date', true),
        column('vip', 'bool', false, false),
      ],
      constraints: 'PRIMARY KEY (rider_id)',
      ownedBy: mine,
      ownedByNobody: 'false',
    },
    {
      name: 'trips',
      columns: [
        column('trip_id', 'serial', false, false),
        own(world.orphans),
        column('from_pier', 'int4'),
        column('fare', 'int4', true),
        column('fee', 'int4', true),
        column('big', 'int8', true),
        column('small', 'int2', true, false),
        column('raw', 'numeric'),
        column('delay', 'numeric', true),
        column('price', 'scaled', true),
        column('weight', 'float4', true),
        column('height', 'float8', true),
        column('depth', 'float8'),
        column('day', 'date', true),
        column('any_day', 'date'),
        column('left_at', 'timestamp', true),
        column('boarded_at', 'timestamptz', true),
        column('seen_at', 'timestamptz'),
        column('open', 'bool'),
        column('sky', 'sky'),
        column('note', 'text'),
        column('code', 'bpchar'),
        column('wait', 'interval'),
        column('shout', 'caseless'),
        column('tod', 'time'),
        column('token', 'uuid'),
      ],
      constraints: 'PRIMARY KEY (trip_id)',
      ownedBy: mine,
      ownedByNobody: 'rider_id IS NULL',
    },
    {
      name: 'legs',
      columns: [own(false), column('seq', 'serial', false, false), column('km', 'numeric', true), column('pier', 'int4'), column('label', 'text')],
      constraints: 'PRIMARY KEY (rider_id, seq)',
      ownedBy: mine,
      ownedByNobody: 'false',
    },
    {
      name: 'passes',
      columns: [own(false), column('zone', 'int4', true), column('cost', 'scaled', true), column('until', 'date', true)],
      constraints: 'UNIQUE (rider_id)',
      ownedBy: mine,
      ownedByNobody: 'false',
    },
    {
      name: 'complaints',
      columns: [
        column('complaint_id', 'serial', false, false),
        column('trip_id', 'reference'),
        column('topic', 'text'),
        column('severity', 'int2', true),
        column('filed', 'date', true),
      ],
      constraints: 'PRIMARY KEY (complaint_id)',
      ownedBy: trip(mine),
      ownedByNobody: `(trip_id IS NULL OR trip_id NOT IN (SELECT trip_id FROM {s}.trips WHERE rider_id IS NOT NULL))`,
    },
    {
      name: 'replies',
      columns: [
        column('reply_id', 'serial', false, false),
        column('complaint_id', 'reference'),
        column('words', 'int4', true),
        column('at', 'timestamp', true),
      ],
      constraints: 'UNIQUE (reply_id)',
      ownedBy: complaint(mine),
      ownedByNobody: `(complaint_id IS NULL OR NOT coalesce(${complaint('rider_id IS NOT NULL')}, false))`,
    },
    {
      name: 'piers',
      columns: [
        column('pier_id', 'serial', false, false),
        column('title', 'text'),
        column('zone', 'int4'),
        column('mark', 'varchar', false, false),
        column('opened', 'date'),
      ],
      constraints: 'PRIMARY KEY (pier_id), UNIQUE (mark)',
      ownedBy: null,
      ownedByNobody: null,
    },
    {
      name: 'zones',
      columns: [column('zone', 'int4'), column('label', 'text'), column('rate', 'float8'), column('sign', 'bpchar'), column('since', 'timestamp')],
      constraints: '',
      ownedBy: null,
      ownedByNobody: null,
    },
    {
      name: 'marks',
      columns: [column('key', 'int8', false, false), column('moment', 'timestamp', false, false), column('word', 'text')],
      constraints: 'UNIQUE (key), UNIQUE (moment)',
      ownedBy: null,
      ownedByNobody: null,
    },
  ]
}

const types: Readonly<Record<string, string>> = {
  numeric: 'numeric',
  scaled: 'numeric(6,1)',
  varchar: 'varchar(16)',
  bpchar: 'char(3)',
  serial: 'bigint',
  reference: 'bigint',
  sky: 'fuzz_kinds.sky',
  caseless: 'text',
  float4: 'real',
}

export function typeOf(world: World, kind: FuzzColumn['kind']): string {
  if (kind === 'person') return world.person === 'numeric' ? 'numeric(30,2)' : world.person === 'varchar' ? 'varchar(16)' : world.person
  return types[kind] ?? kind
}

export function createSql(world: World, schema: string): string {
  const tables = tablesOf(world).map((table) => {
    const columns = table.columns.map(
      (each) => `${each.name} ${typeOf(world, each.kind)}${each.kind === 'caseless' ? ' COLLATE fuzz_kinds.caseless' : ''}${each.nullable ? '' : ' NOT NULL'}`,
    )
    return `CREATE UNLOGGED TABLE ${schema}.${table.name} (${[...columns, ...(table.constraints === '' ? [] : [table.constraints])].join(', ')});`
  })
  return `CREATE SCHEMA ${schema}; ${tables.join(' ')}`
}

/** Bounds small enough to bite, clamps narrower than the data. */
export function policyOf(schema: string): string {
  return `dataset: ferries
schema: ${schema}
person: { called: rider, key: riders.rider_id }
tables:
  riders:
    person: rider_id
    columns:
      birth_year: { clamp: [-5, 5], step: 1 }
      district: { values: [a, b, fog] }
      nick: {}
      code: {}
      score: { clamp: [-1000, 1000] }
      joined: { clamp: [2025-01-01, 2026-12-31] }
      vip: {}
  trips:
    person: rider_id
    bounds: { groups: 3, rows: 3 }
    columns:
      from_pier: { values_from: zones.zone }
      fare: { clamp: [0, 10], step: 5 }
      fee: { clamp: [-3, 7], step: 1 }
      big: { clamp: [-400000000000000000, 400000000000000000] }
      small: { clamp: [0, 3], step: 1 }
      raw: {}
      delay: { clamp: [-2, 100], step: 0.5 }
      price: { clamp: [0, 50] }
      weight: { clamp: [0, 1234567], step: 1 }
      height: { clamp: [0, 1] }
      depth: {}
      day: { clamp: [2025-01-01, 2026-12-31] }
      any_day: {}
      left_at: { clamp: [2025-01-01 00:00, 2026-12-31 00:00] }
      boarded_at: { clamp: [2025-01-01 00:00Z, 2026-12-31 00:00Z] }
      seen_at: {}
      open: {}
      sky: { values: [fog, calm] }
      note: {}
      code: { values: [a, x] }
      wait: {}
      shout: {}
      tod: {}
      token: {}
  legs:
    person: rider_id
    bounds: { groups: 2, rows: 2 }
    columns: { seq: {}, km: { clamp: [0, 3] }, pier: {}, label: {} }
  passes: { person: rider_id, bounds: { groups: 1, rows: 1 }, columns: { zone: { clamp: [0, 5] }, cost: { clamp: [-10, 10] }, until: { clamp: [2025-01-01, 2026-12-31] } } }
  complaints:
    person: { through: trips.trip_id, by: trip_id }
    bounds: { groups: 2, rows: 3 }
    columns: { topic: {}, severity: { clamp: [0, 3] }, filed: { clamp: [2025-01-01, 2026-12-31] } }
  replies:
    person: { through: complaints.complaint_id, by: complaint_id }
    columns: { words: { clamp: [-1, 4] }, at: { clamp: [2025-01-01 00:00, 2026-12-31 00:00] } }
  piers: { published: true }
  zones: { published: true }
  marks: { published: true }
`
}

/** Rows by table, one cell a column in the order of `tablesOf`. */
export type Rows = Readonly<Record<string, readonly (readonly Cell[])[]>>

/** A data set: a handful of persons, one of them with very many rows, and rows of nobody. */
export function rowsOf(world: World, random: Random, heavy: number): Rows {
  const persons = (personPools[world.person] ?? []).filter(() => random.chance(0.8))
  const tables = tablesOf(world)
  const rows: Record<string, (readonly Cell[])[]> = Object.fromEntries(tables.map((table) => [table.name, []]))
  const empty = random.chance(0.1) ? random.pick(tables).name : ''
  let serial = 0
  const add = (name: string, person: Cell, reference: Cell): Cell => {
    serial += 1
    const table = tables.find((each) => each.name === name)
    const cells = (table?.columns ?? []).map((each): Cell => {
      if (each.kind === 'person') return person
      if (each.kind === 'serial') return serial.toString()
      if (each.kind === 'reference') return reference
      if (name === 'marks' && each.name !== 'word') return markValues[each.kind]?.[rows['marks']?.length ?? 0] ?? null
      return cellOf(each.kind, each.nullable, random)
    })
    if (cells.some((cell, i) => cell === null && table?.columns[i]?.nullable === false)) return null
    if (name !== empty) rows[name]?.push(cells)
    return serial.toString()
  }
  const children = (trip: Cell): void => {
    if (!random.chance(0.4)) return
    for (let i = random.below(3); i >= 0; i -= 1) {
      const complaint = add('complaints', null, random.chance(0.05) ? null : trip)
      for (let j = random.below(3); j > 0; j -= 1) add('replies', null, random.chance(0.05) ? null : complaint)
    }
  }
  for (const [i, person] of persons.entries()) {
    if (random.chance(0.9)) add('riders', person, null)
    if (random.chance(0.6)) add('passes', person, null)
    const trips = i === 0 ? heavy : random.below(12)
    for (let n = 0; n < trips; n += 1) children(add('trips', person, null))
    for (let n = random.below(6); n > 0; n -= 1) add('legs', person, null)
    // the same row twice, all but its key
    const last = rows['trips']?.at(-1)
    if (last !== undefined) for (let n = random.below(4); n > 0; n -= 1) rows['trips']?.push([(serial += 1).toString(), ...last.slice(1)])
  }
  if (world.orphans) for (let n = random.below(6); n > 0; n -= 1) children(add('trips', null, null))
  children('777777')
  for (let n = 0; n < 6; n += 1) {
    add('piers', null, null)
    add('zones', null, null)
    add('marks', null, null)
  }
  const marks = new Set<Cell>()
  rows['piers'] = (rows['piers'] ?? [])
    .filter((row) => !marks.has(row[3] ?? null) && marks.add(row[3] ?? null) !== undefined)
    .map((row, i) => [i.toString(), ...row.slice(1)])
  return rows
}

const markValues: Readonly<Record<string, readonly string[]>> = {
  int8: ['9007199254740992', '9007199254740993', '0', '1', '2', '3'],
  timestamp: ['2025-03-30 02:30:00', '2025-03-30 03:30:00', '2025-10-26 02:30:00', '2025-01-31 00:00:00', '2025-01-01 00:00:00', 'infinity'],
}
