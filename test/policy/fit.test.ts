import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { Catalog } from '../../src/catalog/catalog.ts'
import type { DataSet, PrivateTable } from '../../src/policy/data-set.ts'
import { fit } from '../../src/policy/fit.ts'
import { readDataSetFile } from '../../src/policy/read.ts'
import { readCatalog } from '../../src/vault/catalog.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { exchanged, marked } from './marked.ts'

let server: TestServer
let catalog: Catalog

const vault = `
CREATE TYPE weather AS ENUM ('fog', 'calm', 'gale');
CREATE DOMAIN pence AS integer;
CREATE COLLATION caseless (provider = icu, locale = 'und-u-ks-level2', deterministic = false);
CREATE TABLE riders (
  rider_id integer PRIMARY KEY, code text UNIQUE, badge numeric NOT NULL UNIQUE, nick text COLLATE caseless NOT NULL UNIQUE,
  partial integer NOT NULL, deferred integer NOT NULL UNIQUE DEFERRABLE, birth_year integer, district text, referred_by integer REFERENCES riders);
CREATE UNIQUE INDEX ON riders (partial) WHERE partial > 0;
CREATE TABLE piers (pier_id integer PRIMARY KEY, name text NOT NULL, zone integer);
CREATE TABLE trips (
  trip_id bigint PRIMARY KEY, rider_id integer REFERENCES riders, companion integer REFERENCES riders, wide_rider bigint, ref bigint,
  from_pier integer REFERENCES piers, fare integer, delay numeric(5,1), height double precision, boarded_at timestamptz, day date,
  sky weather, price pence, tags text[], open boolean, wait interval, UNIQUE (trip_id, ref));
CREATE TABLE complaints (complaint_id integer PRIMARY KEY, trip_id bigint NOT NULL REFERENCES trips, small integer, topic text);
CREATE TABLE replies (reply_id integer PRIMARY KEY, complaint_id integer REFERENCES complaints, words integer);
CREATE TABLE passes (rider_id integer NOT NULL UNIQUE REFERENCES riders, zone integer);
CREATE TABLE old_riders (rider_id integer NOT NULL); ALTER TABLE old_riders ADD PRIMARY KEY (rider_id);
CREATE TABLE older_riders () INHERITS (old_riders);
CREATE VIEW rider_view AS SELECT * FROM riders;
CREATE VIEW pier_view AS SELECT * FROM piers;
CREATE VIEW busy_piers AS SELECT p.* FROM piers p WHERE EXISTS (SELECT FROM trips t WHERE t.from_pier = p.pier_id);
CREATE TABLE notes (note_id integer, trip_id bigint REFERENCES trips);
CREATE TABLE note_marks (note_id integer, mark text); ALTER TABLE notes ADD PRIMARY KEY (note_id); ALTER TABLE note_marks ADD FOREIGN KEY (note_id) REFERENCES notes;
CREATE FUNCTION peek() RETURNS SETOF integer LANGUAGE sql AS 'SELECT rider_id FROM riders';
CREATE VIEW peeking AS SELECT peek FROM peek();
CREATE SCHEMA yard; CREATE TABLE yard.repairs (rider_id integer, cost integer);
`

const policy = `dataset: ferries
person: { called: rider, key: riders.rider_id }
tables:
  riders:
    person: rider_id
    columns: { birth_year: {}, district: { values: [Northbank, Eastquay] } }
  trips:
    person: rider_id
    bounds: { groups: 12, rows: 20 }
    columns:
      fare: { clamp: [0, 2500], step: 1 }
      from_pier: { values_from: piers.pier_id }
  complaints:
    person: { through: trips.trip_id, by: trip_id }
    columns: { topic: {} }
  piers: { published: true }
`

beforeAll(async () => {
  server = await testServer()
  const client = new pg.Client({ connectionString: await server.createDatabase('fit') })
  await client.connect()
  try {
    await client.query(vault)
    catalog = await readCatalog(client, ['public', 'yard'])
  } finally {
    await client.end()
  }
})

afterAll(() => server.stop())

function fitted(text: string): { readonly dataSet: DataSet | null; readonly complaints: readonly string[]; readonly warnings: readonly string[] } {
  const draft = readDataSetFile(text, 'ferries.yaml')
  if (draft.kind === 'complaints') throw new Error(JSON.stringify(draft.complaints))
  const outcome = fit(draft.value, catalog)
  const print = (each: { readonly line: number; readonly column: number; readonly message: string }): string => `${each.line}:${each.column} ${each.message}`
  return {
    dataSet: outcome.kind === 'fits' ? outcome.value : null,
    complaints: outcome.kind === 'fits' ? [] : outcome.complaints.map(print),
    warnings: outcome.warnings.map(print),
  }
}

function privateTable(dataSet: DataSet | null, key: string): PrivateTable {
  const table = dataSet?.tables.get(key)
  if (table?.kind !== 'private') throw new Error(`no private table ${key}`)
  return table
}

const column = 'fare: { clamp: [0, 2500], step: 1 }'
const district = 'values: [Northbank, Eastquay]'
const piers = '  piers: { published: true }'

/** What is exchanged in a policy that fits, for what, and the only complaint, whose place is marked. */
const cases: readonly (readonly [from: string, to: string, message: string])[] = [
  ['key: riders.rider_id', 'key: ▸rider.rider_id', 'person.key: the vault has no table public.rider'],
  ['key: riders.rider_id', 'key: ▸riders.rider', 'person.key: public.riders has no column rider'],
  ['  piers:', '  ▸pears:', 'the vault has no table public.pears|'],
  ['person: rider_id\n    bounds', 'person: ▸ridr_id\n    bounds', 'public.trips has no column ridr_id'],
  ['person: rider_id\n    bounds', 'person: ▸wide_rider\n    bounds', 'public.trips.wide_rider has type bigint, but the person key has type integer'],
  ['person: rider_id\n    columns', 'person: ▸birth_year\n    columns', 'public.riders holds the person key: its rows belong to rider_id|'],
  ['through: trips.trip_id', 'through: ▸trips.tripid', 'public.trips has no column tripid'],
  ['through: trips.trip_id', 'through: ▸trips.ref', 'trips.ref is not proved unique, so a row of public.complaints could belong to several persons'],
  ['through: trips.trip_id', 'through: ▸piers.pier_id', 'public.piers is no private table of this policy'],
  ['through: trips.trip_id', 'through: ▸complaints.complaint_id', 'the way from public.complaints to its person leads back to public.complaints'],
  ['by: trip_id', 'by: ▸tripid', 'public.complaints has no column tripid'],
  ['by: trip_id', 'by: ▸small', 'public.complaints.small has type integer, but trips.trip_id has type bigint'],
  ['    bounds: { groups: 12, rows: 20 }\n', '', 'tables.trips: bounds is missing'],
  ['{ groups: 12, rows: 20 }', '▸{ groups: 12 }', 'tables.trips.bounds.rows is missing'],
  [
    '{ groups: 12, rows: 20 }',
    '▸{ groups: 1000000, rows: 1001 }',
    'tables.trips.bounds: 1000000 groups of 1001 rows are more than 1000000000 rows for one person',
  ],
  ['topic: {}', '▸topics: {}', 'public.complaints has no column topics'],
  [column, 'fare: { clamp: [0, ▸25.5] }', 'public.trips.fare has type integer: clamp 25.5 is not a whole number from -2147483648 to 2147483647'],
  [column, 'fare: { clamp: [0, ▸3000000000] }', 'public.trips.fare has type integer: clamp 3000000000 is not a whole number from -2147483648 to 2147483647'],
  [column, 'fare: { clamp: ▸[2500, 0] }', 'public.trips.fare: clamp 2500 is not below 0'],
  [column, 'fare: { clamp: ▸[7, 7] }', 'public.trips.fare: clamp 7 is not below 7'],
  [column, 'fare: { clamp: [0, ▸2501], step: 5 }', 'public.trips.fare: clamp 2501 is no multiple of the step 5'],
  [column, 'fare: { clamp: [0, 2500], step: ▸0.5 }', 'public.trips.fare: step 0.5 is finer than integer'],
  [column, 'delay: { clamp: [0, ▸0.25] }', 'public.trips.delay has type numeric(5,1): clamp 0.25 is not a number that numeric(5,1) can hold'],
  [column, 'delay: { clamp: [▸-0.1, 120], step: 0.5 }', 'public.trips.delay: clamp -0.1 is no multiple of the step 0.5'],
  [column, 'day: { clamp: [2025-01-01, ▸2025-02-30] }', 'public.trips.day has type date: clamp 2025-02-30 is not a date such as 2025-01-31'],
  [column, 'day: { clamp: [2025-01-01, 2025-02-28], step: ▸1 }', 'public.trips.day has type date: only numbers have a step'],
  [
    column,
    'boarded_at: { clamp: [▸now, 2025-02-28] }',
    'public.trips.boarded_at has type timestamp with time zone: clamp now is not a date or a time of a day, in UTC or with an offset, such as 2025-01-31 08:30+01:00',
  ],
  [column, 'open: { clamp: ▸[false, true] }', 'public.trips.open has type boolean, which cannot be clamped'],
  [column, 'sky: { values: [fog, ▸storm] }', 'public.trips.sky has type weather: values storm is not one of the labels fog, calm, gale'],
  [column, 'price: { clamp: ▸[0, 1] }', 'public.trips.price has type pence, for which nothing can be declared'],
  [column, 'tags: { values: ▸[a] }', 'public.trips.tags has type text[], for which nothing can be declared'],
  [district, 'values: [Northbank, ▸Northbank]', 'public.riders.district: values lists Northbank twice'],
  [column, 'fare: { values: [1, ▸1.0] }', 'public.trips.fare: values lists 1.0 twice (as 1)'],
  [column, 'fare: { clamp: [0, 5], values: [1, ▸6] }', 'public.trips.fare: the value 6 lies outside the clamp'],
  [column, 'fare: { values: [1], ▸values_from: piers.zone }', 'public.trips.fare declares both values and values_from|'],
  [
    'values_from: piers.pier_id',
    'values_from: ▸riders.birth_year',
    'public.trips.from_pier: values_from riders.birth_year does not name a published table of this policy',
  ],
  ['values_from: piers.pier_id', 'values_from: ▸piers.pier', 'public.trips.from_pier: values_from piers.pier: the table has no column pier'],
  ['values_from: piers.pier_id', 'values_from: ▸piers.name', 'public.trips.from_pier has type integer, but piers.name has type text'],
  [column, '▸companion: {}', 'public.trips.companion refers to a second rider by a foreign key to public.riders, whom this row does not protect'],
  [
    'birth_year: {}',
    '▸referred_by: {}',
    'public.riders.referred_by refers to a second rider by a foreign key to public.riders, whom this row does not protect',
  ],
  [column, 'trip_id: { ▸clamp: [0, 1] }', 'public.trips.trip_id links rows to persons and can carry no declarations'],
  [piers, `${piers}\n  ▸passes: { published: true }`, 'public.passes cannot be published: its foreign key (rider_id) refers to public.riders'],
  [piers, `${piers}\n  ▸notes: { published: true }`, 'public.notes cannot be published: its foreign key (trip_id) refers to public.trips'],
  [piers, `${piers}\n  ▸note_marks: { published: true }`, 'public.note_marks cannot be published: its foreign key (note_id) refers to public.notes'],
  [piers, `${piers}\n  ▸rider_view: { published: true }`, 'public.rider_view cannot be published: it reads public.riders'],
  [piers, `${piers}\n  ▸busy_piers: { published: true }`, 'public.busy_piers cannot be published: it reads public.trips'],
  [piers, `${piers}\n  ▸peeking: { published: true }`, 'public.peeking cannot be published: it calls public.peek(), and what a function reads cannot be seen'],
]

describe('a policy that does not fit the vault', () => {
  test.each(cases)('%s → %s: %s', (from, to, message) => {
    const { text, places } = marked(exchanged(policy, from, to))
    const { complaints } = fitted(text)
    const [wanted = ''] = message.split('|')
    if (message.includes('|')) expect(complaints.map((each) => each.replace(/^\S+ /, ''))).toContain(wanted)
    else expect(complaints.map((each) => each.replace(/^\S+ /, ''))).toEqual([wanted])
    if (places.length > 0) expect(complaints).toContain(`${places[0]} ${wanted}`)
  })

  test.each([
    ['code', '2:31 person.key: riders.code can be NULL'],
    ['partial', '2:31 person.key: riders.partial is not proved unique'],
    ['deferred', '2:31 person.key: riders.deferred is not proved unique'],
    ['badge', '2:31 person.key: riders.badge has type numeric, in which equal values may print apart'],
    ['nick', '2:31 person.key: riders.nick has type text, in which equal values may print apart'],
  ])('a person key must be unique, not NULL and canonical: %s', (name, complaint) => {
    const text = `dataset: ferries\nperson: { called: rider, key: riders.${name} }\ntables:\n  piers: { published: true }\n`
    expect(fitted(text).complaints).toContain(complaint)
  })

  test.each(['old_riders', 'rider_view'])('inheritance and views prove nothing unique: %s', (name) => {
    expect(fitted(`dataset: ferries\nperson: { called: rider, key: ${name}.rider_id }\ntables:\n  piers: { published: true }\n`).complaints).toContain(
      `2:31 person.key: ${name}.rider_id is not proved unique`,
    )
  })

  test('the table of persons cannot be published', () => {
    const text = 'dataset: ferries\nperson: { called: rider, key: riders.rider_id }\ntables:\n  riders: { published: true }\n'
    expect(fitted(text).complaints).toEqual(['4:3 public.riders holds the person key and cannot be published'])
  })

  test('a way in a circle is refused', () => {
    const text =
      exchanged(
        policy,
        'person: { through: trips.trip_id, by: trip_id }',
        'person: { through: replies.reply_id, by: complaint_id }\n    bounds: { groups: 1, rows: 1 }',
      ) + '  replies:\n    person: { through: complaints.complaint_id, by: complaint_id }\n    bounds: { groups: 1, rows: 1 }\n'
    expect(fitted(text).complaints).toEqual(['19:24 the way from public.replies to its person leads back to public.complaints'])
  })

  test('all complaints come at once, with the nearest name as remedy', () => {
    const draft = readDataSetFile(policy.replace('topic:', 'topics:').replace('birth_year', 'birthyear').replace('2500', '2500.5'), 'ferries.yaml')
    const outcome = draft.kind === 'fits' ? fit(draft.value, catalog) : draft
    expect(outcome.kind === 'complaints' && outcome.complaints.map((each) => each.remedy)).toEqual([
      'did you mean birth_year?',
      'write a literal of type integer',
      'did you mean topic?',
    ])
  })
})

describe('a policy that fits', () => {
  test('a table owned through another takes its bounds, and the links are there unlisted', () => {
    const { dataSet, complaints } = fitted(policy)
    expect(complaints).toEqual([])
    expect(privateTable(dataSet, 'public.complaints')).toMatchObject({ bounds: { groups: 12, rows: 20 }, onePerPerson: false })
    expect([...privateTable(dataSet, 'public.complaints').columns.values()].map((each) => [each.name, each.role])).toEqual([
      ['trip_id', 'linking'],
      ['topic', 'listed'],
    ])
    expect(privateTable(dataSet, 'public.riders')).toMatchObject({ onePerPerson: true, bounds: { groups: 1, rows: 1 } })
  })

  test('a way over two tables is the steps to the one that knows the person', () => {
    const { dataSet } = fitted(`${policy}  replies:\n    person: { through: complaints.complaint_id, by: complaint_id }\n    columns: { words: {} }\n`)
    expect(privateTable(dataSet, 'public.replies').owner).toEqual({
      kind: 'through',
      steps: [
        { column: 'complaint_id', table: 'public.complaints', referenced: 'complaint_id' },
        { column: 'trip_id', table: 'public.trips', referenced: 'trip_id' },
      ],
      person: 'rider_id',
    })
    expect(privateTable(dataSet, 'public.complaints').columns.get('complaint_id')?.role).toBe('linking')
  })

  test('one row for each person is proved by a unique ownership column: wider bounds are tightened, with a warning', () => {
    const { dataSet, warnings } = fitted(`${policy}  passes: { person: rider_id, bounds: { groups: 2, rows: 3 }, columns: { zone: {} } }\n`)
    expect(privateTable(dataSet, 'public.passes')).toMatchObject({ onePerPerson: true, bounds: { groups: 1, rows: 1 } })
    expect(warnings).toEqual(['17:39 public.passes has one row for each person: its bounds are taken as 1 group and 1 row'])
  })

  test('a view proves nothing: it needs bounds even over a unique column', () => {
    expect(fitted(`${policy}  rider_view: { person: rider_id, columns: { district: {} } }\n`).complaints).toEqual(['17:3 tables.rider_view: bounds is missing'])
  })

  test('numeric brings its own step, other numbers none, and literals are canonical', () => {
    const { dataSet } = fitted(
      exchanged(
        policy,
        column,
        'delay: { clamp: [0, 1.2e2] }\n      height: { clamp: [-1e2, 0.50] }\n      wait: { clamp: [0:00, 90 minutes] }\n      day: { clamp: [2025-01-01, 2025-12-31] }',
      ),
    )
    const { columns } = privateTable(dataSet, 'public.trips')
    expect(['delay', 'height', 'wait', 'day'].map((name) => [columns.get(name)?.clamp, columns.get(name)?.step])).toEqual([
      [['0', '120'], '0.1'],
      [['-100', '0.5'], null],
      [['00:00:00', '01:30:00'], null],
      [['2025-01-01', '2025-12-31'], null],
    ])
  })

  test('a column about a second person can be accepted, and odd types listed bare', () => {
    expect(fitted(exchanged(policy, column, 'companion: { also_identifies: accepted }\n      tags: {}\n      price:')).complaints).toEqual([])
  })

  test('keys are undeclared as soon as one listed private column has neither values nor two of them', () => {
    const declared =
      'dataset: ferries\nperson: { called: rider, key: riders.rider_id }\ntables:\n  riders: { person: rider_id, columns: { district: { values: [Northbank] } } }\n  trips: { person: rider_id, bounds: { groups: 1, rows: 1 }, columns: { open: {}, rider_id: {} } }\n'
    expect(fitted(declared).dataSet?.hasUndeclaredKeys).toBe(false)
    expect(fitted(declared.replace('open: {}', 'day: { clamp: [2025-01-01, 2025-12-31] }')).dataSet?.hasUndeclaredKeys).toBe(true)
  })

  test('a source of values that is not unique is warned of', () => {
    expect(fitted(exchanged(policy, 'piers.pier_id', 'piers.zone')).warnings).toEqual([
      '12:33 public.trips.from_pier: piers.zone is not proved unique and free of NULL',
    ])
  })

  test('a table of another schema and a view over published tables can be listed', () => {
    const { dataSet } = fitted(
      `${policy}  yard.repairs: { person: rider_id, bounds: { groups: 1, rows: 2 }, columns: { cost: {} } }\n  pier_view: { published: true }\n`,
    )
    expect([...(dataSet?.tables.keys() ?? [])].slice(-2)).toEqual(['yard.repairs', 'public.pier_view'])
    expect(dataSet?.tables.get('public.pier_view')).toMatchObject({ kind: 'published', uniqueKeys: [], primaryKey: null })
  })
})
