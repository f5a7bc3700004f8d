import { mkdtemp, readFile, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import pg from 'pg'
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import type { Catalog } from '../../src/catalog/catalog.ts'
import { ferryConstraints, ferryTables } from '../../src/demo/schema.ts'
import { loadPolicies } from '../../src/files/load-policies.ts'
import type { Outcome } from '../../src/policy/complaint.ts'
import { readCatalog } from '../../src/vault/catalog.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'

let server: TestServer
let client: pg.Client
let directory: string
const catalogOf = (schemas: readonly string[]): Promise<Catalog> => readCatalog(client, schemas)
const shipped = new URL('../../policies/', import.meta.url).pathname

beforeAll(async () => {
  server = await testServer()
  client = new pg.Client({ connectionString: await server.createDatabase('policies') })
  await client.connect()
  await client.query(ferryTables)
  for (const constraint of ferryConstraints) await client.query(constraint)
})
afterAll(async () => {
  await client.end()
  await server.stop()
})
beforeEach(async () => {
  directory = await mkdtemp(join(tmpdir(), 'policies-'))
})
afterEach(async () => {
  await rm(directory, { recursive: true, force: true })
})

async function write(files: Readonly<Record<string, string | Uint8Array>>): Promise<void> {
  for (const [name, text] of Object.entries(files)) await writeFile(join(directory, name), text)
}

async function shippedText(name: string): Promise<string> {
  return await readFile(join(shipped, name), 'utf8')
}

function complaintsOf<T>(outcome: Outcome<T>): readonly string[] {
  return outcome.kind === 'fits' ? [] : outcome.complaints.map((each) => `${each.file.slice(directory.length + 1)}:${each.line}:${each.column} ${each.message}`)
}

describe('loading policies', () => {
  test('the shipped policies fit the ferry company, with one warning: all analysts together may learn a lot', async () => {
    const outcome = await loadPolicies(shipped, catalogOf)
    expect(outcome.kind === 'complaints' ? outcome.complaints : outcome.warnings.map((each) => each.message)).toEqual([
      'everyone.ferries.epsilon: 12 bounds very little: odds about a person may change by a factor of e^12',
    ])
    if (outcome.kind !== 'fits') return
    const ferries = outcome.value.dataSets.get('ferries')
    expect(ferries).toMatchObject({
      personCalled: 'rider',
      personTable: 'public.riders',
      personColumn: 'rider_id',
      replyAfterMs: 1000,
      defaults: { epsilon: '0.1', delta: '1e-8' },
      hasUndeclaredKeys: true,
    })
    expect(ferries?.personKey).toMatch(/^\d+\/public\.riders\.rider_id$/)
    expect(ferries?.policyHash).toMatch(/^[0-9a-f]{64}$/)
    expect([...(ferries?.tables.keys() ?? [])]).toEqual(['public.riders', 'public.trips', 'public.complaints', 'public.piers'])
    expect(ferries?.tables.get('public.riders')).toMatchObject({ kind: 'private', onePerPerson: true, bounds: { groups: 1, rows: 1 } })
    expect(ferries?.tables.get('public.complaints')).toMatchObject({
      owner: { kind: 'through', steps: [{ column: 'trip_id', table: 'public.trips', referenced: 'trip_id' }], person: 'rider_id' },
      onePerPerson: false,
    })
    const trips = ferries?.tables.get('public.trips')
    expect([...(trips?.columns.values() ?? [])].map((column) => [column.name, column.role, column.clamp, column.step])).toEqual([
      ['trip_id', 'linking', null, null],
      ['rider_id', 'linking', null, null],
      ['boarded_at', 'listed', ['2025-01-01 00:00:00+00', '2027-01-01 00:00:00+00'], null],
      ['from_pier', 'listed', null, null],
      ['to_pier', 'listed', null, null],
      ['fare_pence', 'listed', ['0', '2500'], '1'],
      ['delay_min', 'listed', ['0', '120'], '0.5'],
    ])
    expect(trips?.columns.get('from_pier')?.valuesFrom).toEqual({ table: 'public.piers', column: 'pier_id' })
    expect(outcome.value.analysts.get('ana')?.data.get('ferries')).toEqual({ epsilon: '4', delta: '1e-6', renews: 'never' })
    expect(outcome.value.everyone.get('ferries')).toEqual({ epsilon: '12', delta: '1e-5', renews: 'never' })
  })

  test('complaints of all files come at once, each with its place', async () => {
    const ferries = (await shippedText('ferries.yaml')).replace('rows: 20 }', 'rows: many }')
    const analysts = (await shippedText('analysts.yaml')).replace('renews: never', 'renews: daily')
    await write({ 'ferries.yaml': ferries, 'analysts.yaml': analysts, 'other.yaml': 'dataset: [', 'notes.txt': 'not a policy' })
    expect(complaintsOf(await loadPolicies(directory, catalogOf))).toEqual([
      'analysts.yaml:11:51 analysts.ana.data.ferries.renews: daily is not a renewal period',
      expect.stringMatching(/^ferries\.yaml:33:33 tables\.trips\.bounds\.rows: many is not a whole number/),
      expect.stringMatching(/^other\.yaml:1:11 a character is missing here/),
    ])
  })

  test('what the catalogue and the caps find wrong comes together too', async () => {
    await write({
      'ferries.yaml': (await shippedText('ferries.yaml')).replace('birth_year', 'birth_yaer'),
      'analysts.yaml': (await shippedText('analysts.yaml')).replace('everyone:\n  ferries', 'everyone:\n  feries'),
    })
    expect(complaintsOf(await loadPolicies(directory, catalogOf))).toEqual([
      'analysts.yaml:11:7 analysts.ana.data.ferries: everyone has no cap for ferries',
      'analysts.yaml:16:7 analysts.ben.data.ferries: everyone has no cap for ferries',
      'analysts.yaml:20:3 everyone: there is no data set feries',
      'ferries.yaml:25:7 public.riders has no column birth_yaer',
    ])
  })

  test('one data set in two files, or analysts in two files, is refused', async () => {
    const [ferries, analysts] = [await shippedText('ferries.yaml'), await shippedText('analysts.yaml')]
    await write({ 'a.yaml': ferries, 'b.yaml': ferries, 'c.yaml': analysts, 'd.yaml': analysts })
    expect(complaintsOf(await loadPolicies(directory, catalogOf))).toEqual([
      expect.stringContaining(`b.yaml:6:10 dataset: ferries is declared in ${directory}/a.yaml as well`),
      expect.stringContaining('d.yaml:6:1 analysts are listed in'),
    ])
  })

  test('an empty directory, a missing one, a file that is too long and one that is not UTF-8 are refused', async () => {
    expect(complaintsOf(await loadPolicies(directory, catalogOf))).toEqual([':1:1 there is no data set here', ':1:1 there is no file of analysts here'])
    expect(complaintsOf(await loadPolicies(join(directory, 'none'), catalogOf))).toEqual(['none:1:1 the directory cannot be read (ENOENT)'])
    await write({ 'long.yaml': `dataset: ${'a'.repeat(300_000)}`, 'odd.yaml': new Uint8Array([0x64, 0xff, 0xfe]) })
    expect(complaintsOf(await loadPolicies(directory, catalogOf))).toEqual([
      'long.yaml:1:1 the file is longer than 262144 bytes',
      'odd.yaml:1:1 the file is not UTF-8',
    ])
  })
})
