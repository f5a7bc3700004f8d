import { describe, expect, test } from 'vitest'
import type { Outcome } from '../../src/policy/complaint.ts'
import { isAnalystsText, readAnalystsFile, readDataSetFile } from '../../src/policy/read.ts'
import { exchanged, marked } from './marked.ts'

const ferries = `dataset: ferries
schema: public
person: { called: rider, key: riders.rider_id }
defaults: { epsilon: 0.1, delta: 1e-8 }
reply_after: 0.3s
tables:
  riders:
    person: rider_id
    columns: { district: { values: [Northbank, Eastquay] } }
  trips:
    person: rider_id
    bounds: { groups: 12, rows: 20 }
    columns:
      fare_pence: { clamp: [0, 2500], step: 1 }
      from_pier: { values_from: piers.pier_id }
  complaints:
    person: { through: trips.trip_id, by: trip_id }
  piers: { published: true }
`

const analysts = `analysts:
  ana:
    login: null
    data: { ferries: { epsilon: 4, delta: 1e-6, renews: never } }
everyone: { ferries: { epsilon: 9, delta: 1e-5 } }
`

/** What is exchanged in the well-formed file, for what (the place of the complaint is marked), and the message. */
const dataSetCases: readonly (readonly [from: string, to: string, message: string])[] = [
  ['dataset: ferries', '▸dataste: ferries', 'the key dataste is not known here|the file: dataset'],
  ['dataset: ferries', 'dataset: ▸Ferries', 'dataset: Ferries is not a lower-case word of letters, digits and _, at most 63 long, that begins with a letter'],
  ['dataset: ferries', 'dataset: ▸postgres', 'dataset: postgres is a name that PostgreSQL or the proxy keeps for itself'],
  ['dataset: ferries', 'dataset: ▸pg_ferries', 'dataset: pg_ferries is a name that PostgreSQL or the proxy keeps for itself'],
  ['dataset: ferries', 'dataset: ▸hedgerow_ferries', 'dataset: hedgerow_ferries is a name that PostgreSQL or the proxy keeps for itself'],
  ['dataset: ferries', 'dataset: ▸[ferries]', 'dataset is a list, not a single value'],
  ['dataset: ferries', 'dataset:▸', 'dataset is empty, not a single value'],
  ['schema: public', 'schema: ▸public.x', 'schema: public.x is not the name of a schema'],
  ['schema: public', 'schema: ▸""', 'schema:  is not the name of a schema'],
  ['person: { called: rider, key: riders.rider_id }', 'person: ▸rider', 'person is a single value, not a mapping'],
  ['person: { called: rider, key: riders.rider_id }', 'person: ▸{ called: rider }', 'person.key is missing'],
  ['called: rider,', 'called: ▸"7",', 'person.called: 7 is not a word'],
  ['called: rider,', 'called: rider, ▸caled: rider,', 'person: the key caled is not known here'],
  ['key: riders.rider_id', 'key: ▸rider_id', 'person.key: rider_id is not the name of a column with its table'],
  ['key: riders.rider_id', 'key: ▸a.b.c.d', 'person.key: a.b.c.d is not the name of a column with its table'],
  ['key: riders.rider_id', 'key: ▸"riders. rider_id"', 'person.key: riders. rider_id is not the name of a column with its table'],
  ['epsilon: 0.1', 'epsilon: ▸0', 'defaults.epsilon: 0 must be greater than 0'],
  ['epsilon: 0.1', 'epsilon: ▸-1', 'defaults.epsilon: -1 must be greater than 0'],
  ['epsilon: 0.1', 'epsilon: ▸.inf', 'defaults.epsilon: .inf is not a plain decimal number'],
  ['epsilon: 0.1', 'epsilon: ▸0x10', 'defaults.epsilon: 0x10 is not a plain decimal number'],
  ['epsilon: 0.1', 'epsilon: ▸1e999', 'defaults.epsilon: 1e999 is not a plain decimal number'],
  ['epsilon: 0.1', 'epsilon: ▸a tenth', 'defaults.epsilon: a tenth is not a plain decimal number'],
  ['epsilon: 0.1', 'epsilon: ▸{}', 'defaults.epsilon is a mapping, not a single value'],
  ['delta: 1e-8', 'delta: ▸0.5', 'defaults.delta: 0.5 must be 0 or more and less than 0.5'],
  ['delta: 1e-8', 'delta: ▸-1e-8', 'defaults.delta: -1e-8 must be 0 or more and less than 0.5'],
  ['delta: 1e-8', '▸dleta: 1e-8', 'defaults: the key dleta is not known here'],
  ['reply_after: 0.3s', 'reply_after: ▸0.3', 'reply_after: 0.3 is not a length of time'],
  ['reply_after: 0.3s', 'reply_after: ▸2m', 'reply_after: 2m is not a length of time'],
  ['reply_after: 0.3s', 'reply_after: ▸90s', 'reply_after: 90s must lie between 1ms and 60s'],
  ['reply_after: 0.3s', 'reply_after: ▸0s', 'reply_after: 0s must lie between 1ms and 60s'],
  ['  riders:\n', '  ▸"a.b.c":\n', 'tables: a.b.c is not the name of a table'],
  ['  riders:\n', '  ▸" riders":\n', 'tables:  riders is not the name of a table'],
  ['piers: { published: true }', 'piers: { published: ▸false }', 'tables.piers.published: false can only be true'],
  ['piers: { published: true }', 'piers: { published: true, ▸columns: {} }', 'tables.piers: the key columns is not known here'],
  ['piers: { published: true }', 'piers: ▸{}', 'tables.piers.person is missing'],
  ['piers: { published: true }', 'piers:▸', 'tables.piers is empty, not a mapping'],
  ['piers: { published: true }', 'piers: { ▸publshed: true, person: pier_id }', 'tables.piers: the key publshed is not known here'],
  ['piers: { published: true }', 'piers: { published: true }\n  ▸public.trips: { published: true }', 'tables: public.trips and trips are the same table'],
  ['through: trips.trip_id, by', 'through: ▸trip_id, by', 'tables.complaints.person.through: trip_id is not the name of a column with its table'],
  [', by: trip_id', '', 'tables.complaints.person.by is missing'],
  [', by: trip_id', ', by: trip_id, ▸via: x', 'tables.complaints.person: the key via is not known here'],
  [', by: trip_id', ', by: ▸[trip_id]', 'tables.complaints.person.by is a list, not a single value'],
  ['{ through: trips.trip_id, by: trip_id }', '▸[trips.trip_id, trip_id]', 'tables.complaints.person is a list, not a mapping'],
  ['{ through: trips.trip_id, by: trip_id }', '▸trips.trip_id', 'tables.complaints.person: trips.trip_id is not the name of a column'],
  ['groups: 12', 'groups: ▸0', 'tables.trips.bounds.groups: 0 is not a whole number from 1 to 1000000'],
  ['groups: 12', 'groups: ▸1.5', 'tables.trips.bounds.groups: 1.5 is not a whole number from 1 to 1000000'],
  ['groups: 12', 'groups: ▸1000001', 'tables.trips.bounds.groups: 1000001 is not a whole number from 1 to 1000000'],
  ['groups: 12', 'groups: ▸12345678', 'tables.trips.bounds.groups: 12345678 is not a whole number from 1 to 1000000'],
  ['groups: 12', 'groups: 12, ▸persons: 3', 'tables.trips.bounds: the key persons is not known here'],
  ['bounds: { groups: 12, rows: 20 }', 'bounds: ▸20', 'tables.trips.bounds is a single value, not a mapping'],
  ['clamp: [0, 2500]', 'clamp: ▸[0]', 'tables.trips.columns.fare_pence.clamp is not a list of two values, the least and the greatest'],
  ['clamp: [0, 2500]', 'clamp: ▸[0, 1, 2]', 'tables.trips.columns.fare_pence.clamp is not a list of two values, the least and the greatest'],
  ['clamp: [0, 2500]', 'clamp: ▸0-2500', 'tables.trips.columns.fare_pence.clamp is a single value, not a list'],
  ['clamp: [0, 2500]', 'clamp: [0, ▸~]', 'tables.trips.columns.fare_pence.clamp.1 is empty, not a single value'],
  ['clamp: [0, 2500]', 'clamp: [▸[0], 2500]', 'tables.trips.columns.fare_pence.clamp.0 is a list, not a single value'],
  ['step: 1', 'step: ▸0', 'tables.trips.columns.fare_pence.step: 0 must be greater than 0'],
  ['step: 1', 'step: ▸-0.5', 'tables.trips.columns.fare_pence.step: -0.5 must be greater than 0'],
  ['step: 1', '▸stepp: 1', 'tables.trips.columns.fare_pence: the key stepp is not known here'],
  ['values: [Northbank, Eastquay]', 'values: ▸[]', 'tables.riders.columns.district.values lists no value'],
  ['values: [Northbank, Eastquay]', 'values: ▸Northbank', 'tables.riders.columns.district.values is a single value, not a list'],
  ['values: [Northbank, Eastquay]', 'values: [Northbank, ▸null]', 'tables.riders.columns.district.values.1 is empty, not a single value'],
  ['values_from: piers.pier_id', 'values_from: ▸piers', 'tables.trips.columns.from_pier.values_from: piers is not the name of a column with its table'],
  ['values_from: piers.pier_id', 'also_identifies: ▸yes', 'tables.trips.columns.from_pier.also_identifies: yes can only be accepted'],
  ['from_pier: {', '▸from.pier: {', 'tables.trips.columns: from.pier is not the name of a column'],
  ['columns: { district: { values: [Northbank, Eastquay] } }', 'columns: ▸[district]', 'tables.riders.columns is a list, not a mapping'],
  [
    'columns: { district: { values: [Northbank, Eastquay] } }',
    'columns: { district: ▸all }',
    'tables.riders.columns.district is a single value, not a mapping',
  ],
  // the text itself
  ['schema: public', 'schema: public\n▸schema: public', 'this key stands twice in the same mapping'],
  ['schema: public', 'schema: &here ▸public', 'anchors and aliases are not used in policies'],
  ['schema: public', 'schema: ▸!!int public', 'tags and directives are not used in policies'],
  ['schema: public', '▸__proto__: public', 'this cannot be a key'],
  ['schema: public', '? ▸[schema]\n: public', 'this cannot be a key'],
  ['schema: public', 'schema: public\n▸---', 'the file holds more than one document'],
  ['schema: public', 'schema: ▸"pub\\0lic"', 'a text holds a NUL character'],
  ['  trips:\n', '  trips:\n▸\t', 'a tab is used to indent|'],
  ['rows: 20 }\n    columns:', 'rows: 20\n    ▸columns:', 'a character is missing here'],
]

const analystCases: readonly (readonly [from: string, to: string, message: string])[] = [
  ['  ana:', '  ▸Ana:', 'analysts: Ana is not a lower-case word of letters, digits and _, at most 63 long, that begins with a letter'],
  ['  ana:', '  ▸postgres:', 'analysts: postgres is a name that PostgreSQL or the proxy keeps for itself'],
  ['  ana:', '  ▸hedgerow_ana:', 'analysts: hedgerow_ana is a name that PostgreSQL or the proxy keeps for itself'],
  ['  ana:', '  ▸pg_ana:', 'analysts: pg_ana is a name that PostgreSQL or the proxy keeps for itself'],
  ['login: null', 'login: ▸harbour', 'analysts.ana.login is not a SCRAM-SHA-256 verifier'],
  [
    'login: null',
    'login: ▸SCRAM-SHA-256$1024:ZmVycnkgY29tcGFueSBhbg==$SPJ7Nc9QdOpAAL4zCNiNf6JQ88EmRwoWyYo2kjc/aOg=:IOMgCK6HzU0L2reYbjWKLQzEOaaYuIIBbzqGfnq4qWQ=',
    'analysts.ana.login is not a SCRAM-SHA-256 verifier',
  ],
  ['login: null', 'login: ▸{ password: harbour }', 'analysts.ana.login is a mapping, not a single value'],
  ['login: null', '▸logn: null', 'analysts.ana: the key logn is not known here'],
  ['ferries: { epsilon: 4, delta: 1e-6, renews: never }', 'ferries: ▸4', 'analysts.ana.data.ferries is a single value, not a mapping'],
  ['ferries: { epsilon: 4, delta: 1e-6, renews: never }', 'ferries: ▸{ epsilon: 4 }', 'analysts.ana.data.ferries.delta is missing'],
  ['epsilon: 4', 'epsilon: ▸four', 'analysts.ana.data.ferries.epsilon: four is not a plain decimal number'],
  ['delta: 1e-6', 'delta: ▸1', 'analysts.ana.data.ferries.delta: 1 must be 0 or more and less than 0.5'],
  ['renews: never', 'renews: ▸weekly', 'analysts.ana.data.ferries.renews: weekly is not a renewal period'],
  ['renews: never', '▸renew: never', 'analysts.ana.data.ferries: the key renew is not known here'],
  [
    'everyone: { ferries',
    'everyone: { ▸Ferries',
    'everyone: Ferries is not a lower-case word of letters, digits and _, at most 63 long, that begins with a letter',
  ],
  ['everyone: { ferries: { epsilon: 9, delta: 1e-5 } }', '', 'everyone is missing'],
]

function found<T>(outcome: Outcome<T>): readonly { readonly place: string; readonly message: string; readonly remedy: string }[] {
  return outcome.kind === 'fits' ? [] : outcome.complaints.map(({ line, column, message, remedy }) => ({ place: `${line}:${column}`, message, remedy }))
}

describe('a malformed data set', () => {
  test.each(dataSetCases)('%s → %s: %s', (from, to, message) => {
    const { text, places } = marked(exchanged(ferries, from, to))
    const complaints = found(readDataSetFile(text, 'ferries.yaml'))
    const [wanted = ''] = message.split('|')
    expect(complaints.map((each) => each.message)).toContain(wanted)
    const complaint = complaints.find((each) => each.message === wanted)
    if (places.length > 0) expect(complaint?.place).toBe(places[0])
    expect(complaint?.remedy).toMatch(/\S/)
    if (!message.includes('|')) expect(complaints).toHaveLength(1)
  })

  test('all complaints come at once, in the order of the text', () => {
    const text = ferries.replace('0.1', 'x').replace('12', 'many').replace('step: 1', 'stepp: 1').replace('true', 'maybe')
    expect(found(readDataSetFile(text, 'ferries.yaml')).map((each) => each.place)).toEqual(['4:22', '12:23', '14:39', '18:23'])
  })

  test('a misspelt key is met with the right one, also where two stand in one mapping', () => {
    const [first, second] = found(readDataSetFile(ferries.replace('clamp:', 'clmp:').replace('step:', 'setp:'), 'ferries.yaml'))
    expect([first?.remedy, second?.remedy]).toEqual(['did you mean clamp?', 'did you mean step?'])
  })

  test.each([
    ['an empty file', '', 'the file is empty, not a mapping'],
    ['a list', '- a', 'the file is a list, not a mapping'],
    ['a word', 'ferries', 'the file is a single value, not a mapping'],
    ['a long file', `# ${'x'.repeat(262_144)}`, 'the file is longer than 262144 bytes'],
    ['deep brackets', `dataset: ${'['.repeat(100_000)}`, 'brackets or lines nest more than 24 deep'],
    ['deep indentation', Array.from({ length: 400 }, (_, depth) => `${' '.repeat(depth)}a:`).join('\n'), 'brackets or lines nest more than 24 deep'],
    ['deep dashes', `${'- '.repeat(50_000)}a`, 'brackets or lines nest more than 24 deep'],
    ['an alias in an alias', 'a: &a [x, x]\nb: &b [*a, *a]\nc: [*b, *b]', 'anchors and aliases are not used in policies'],
  ])('%s is refused', (_title, text, message) => {
    expect(found(readDataSetFile(text, 'ferries.yaml'))[0]?.message).toBe(message)
  })

  test('amounts keep their text: nothing passes through a double', () => {
    const outcome = readDataSetFile(ferries.replace('0.1', '0.10000000000000000000000001').replace('1e-8', '1.0e-08'), 'ferries.yaml')
    expect(outcome.kind === 'fits' && outcome.value.content.defaults).toEqual({ epsilon: '0.10000000000000000000000001', delta: '1.0e-08' })
  })

  test('large amounts are warned of, not refused', () => {
    const outcome = readDataSetFile(ferries.replace('epsilon: 0.1', 'epsilon: 1e30').replace('1e-8', '0.001'), 'ferries.yaml')
    expect([outcome.kind, outcome.warnings.map(({ line, column }) => `${line}:${column}`)]).toEqual(['fits', ['4:22', '4:35']])
  })
})

describe('a malformed file of analysts', () => {
  test.each(analystCases)('%s → %s: %s', (from, to, message) => {
    const { text, places } = marked(exchanged(analysts, from, to))
    const complaints = found(readAnalystsFile(text, 'analysts.yaml'))
    expect(complaints.map((each) => each.message)).toEqual([message])
    if (places.length > 0) expect(complaints[0]?.place).toBe(places[0])
    expect(complaints[0]?.remedy).toMatch(/\S/)
  })

  test('a complaint about a login does not repeat it', () => {
    expect(JSON.stringify(found(readAnalystsFile(analysts.replace('null', 'opensesame'), 'analysts.yaml')))).not.toContain('opensesame')
  })

  test('an analyst without a login, or without a data set, is warned of', () => {
    const outcome = readAnalystsFile('analysts: { ana: {} }\neveryone: {}\n', 'analysts.yaml')
    expect([outcome.kind, outcome.warnings.map((each) => each.message)]).toEqual(['fits', ['ana has no login and cannot connect', 'ana may use no data set']])
  })

  test('is told from a data set by its top', () => {
    expect([isAnalystsText(analysts), isAnalystsText(ferries), isAnalystsText('"everyone" : {}')]).toEqual([true, false, true])
  })
})
