import { performance } from 'node:perf_hooks'
import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { DataTable } from '../../src/policy/data-set.ts'
import { failureOf, ferryAnalyst, ferryLobby, ferryPolicies, ferryTables, type FerryLobby } from './ferry-lobby.ts'

let lobby: FerryLobby
let admin: pg.Client

beforeAll(async () => {
  lobby = await ferryLobby()
  await lobby.install()
  admin = await lobby.admin('ferries')
})
afterAll(() => lobby.stop())

describe('a policy load', () => {
  test('finishes although an analyst holds locks on shells, copies, views and the own role', async () => {
    const tables = new Map(ferryTables())
    const trips = tables.get('public.trips') as Extract<DataTable, { kind: 'private' }>
    tables.set('public.trips', { ...trips, columns: new Map([...trips.columns].filter(([name]) => name !== 'fare_pence')) })
    const [ana, bo, other] = [await lobby.analyst('ana'), await lobby.analyst('bo'), await lobby.analyst('bo')]
    await ana.query("BEGIN; LOCK TABLE trips IN ACCESS SHARE MODE; SELECT * FROM piers LIMIT 1; ALTER ROLE ana SET work_mem = '1MB'")
    await bo.query('BEGIN; DECLARE c CURSOR FOR SELECT * FROM piers; FETCH c')
    await other.query("BEGIN; LOCK TABLE piers IN ACCESS SHARE MODE; PREPARE TRANSACTION 'held'")
    const start = performance.now()
    const report = await lobby.install({ policies: ferryPolicies(tables) })
    expect(performance.now() - start).toBeLessThan(20_000)
    expect([...new Set(report.ended)].sort()).toEqual(['ana', 'bo'])
    const fresh = await lobby.analyst('ana')
    expect(await failureOf(fresh, 'SELECT fare_pence FROM trips')).toBe('42703')
    expect((await fresh.query('SHOW work_mem')).rows).toEqual([{ work_mem: '16MB' }])
    await lobby.install()
    expect(await failureOf(fresh, 'SELECT fare_pence FROM trips')).toBe('42501')
  })

  test('leaves sessions and unchanged shells alone', async () => {
    const ana = await lobby.analyst('ana')
    await ana.query('CREATE TEMP VIEW seen AS SELECT * FROM trips; CREATE TEMP TABLE mine (m mood)')
    const oid = "SELECT 'trips'::regclass::oid AS oid"
    const before = (await admin.query(oid)).rows
    const report = await lobby.install()
    expect(report.ended).toEqual([])
    expect((await admin.query(oid)).rows).toEqual(before)
    expect(await failureOf(ana, 'SELECT * FROM seen')).toBe('42501')
  })

  test('follows the vault: new labels in place, reordered labels by a new type, new rows of published tables', async () => {
    const vault = await lobby.admin('ferry_vault')
    const ana = await lobby.analyst('ana')
    await ana.query("CREATE TEMP TABLE mine AS SELECT 'calm'::mood AS m")
    await vault.query(
      "ALTER TYPE mood ADD VALUE 'glad' BEFORE 'calm'; ALTER TYPE mood ADD VALUE 'tired' AFTER 'calm'; INSERT INTO piers (pier_id) VALUES ('Newquay')",
    )
    await lobby.install()
    const labels =
      "SELECT enum_range(NULL::mood)::text AS labels, (SELECT atttypid::regtype::text FROM pg_attribute WHERE attrelid = 'riders'::regclass AND attname = 'mood') AS used"
    expect((await admin.query(labels)).rows).toEqual([{ labels: '{glad,calm,tired,cross}', used: 'mood' }])
    expect((await ana.query("SELECT m::text FROM mine WHERE m < 'tired'")).rows).toEqual([{ m: 'calm' }])
    expect((await ana.query("SELECT count(*)::int AS n FROM piers WHERE pier_id = 'Newquay'")).rows).toEqual([{ n: 1 }])
    await vault.query("ALTER TYPE mood RENAME VALUE 'glad' TO 'happy'")
    await lobby.install()
    expect((await admin.query(labels)).rows).toEqual([{ labels: '{happy,calm,tired,cross}', used: 'mood' }])
  })

  test('takes log-in and sessions from who left the policy, and tables that left it', async () => {
    await admin.query("SELECT pg_terminate_backend(pid) FROM pg_stat_activity WHERE usename = 'bo'")
    const bo = await lobby.analyst('bo')
    const ended = new Promise((resolve) => bo.once('end', resolve))
    const tables = new Map([...ferryTables()].filter(([key]) => key !== 'public.complaints'))
    const report = await lobby.install({ policies: ferryPolicies(tables, [ferryAnalyst('ana', 'ferries'), ferryAnalyst('cy', 'harbours')]) })
    expect(report).toMatchObject({ removed: ['bo'], ended: ['bo'] })
    await ended
    await expect(lobby.analyst('bo')).rejects.toThrow()
    expect(await failureOf(await lobby.analyst('ana'), 'SELECT * FROM complaints')).toBe('42P01')
    await lobby.install()
    await lobby.analyst('bo')
  })

  test('waits for another one, and two at once both succeed', async () => {
    const both = await Promise.all([lobby.install(), lobby.install()])
    expect(both.map((report) => report.ended)).toEqual([[], []])
  })

  test.skipIf(process.env['HEDGEROW_TEST_DATABASE_URL'])('is refused where the lobby lets an analyst in with any password', async () => {
    const [before] = (
      await admin.query<{ path: string; text: string }>("SELECT current_setting('hba_file') AS path, pg_read_file(current_setting('hba_file')) AS text")
    ).rows
    const write = async (text: string): Promise<void> => {
      await admin.query("SELECT lo_from_bytea(4711, convert_to($1, 'UTF8'))", [text])
      await admin.query('SELECT lo_export(4711, $1)', [before?.path])
      await admin.query('SELECT lo_unlink(4711), pg_reload_conf()')
    }
    await write(`host all ana all trust\n${before?.text}`)
    try {
      await expect
        .poll(() =>
          lobby.analyst('ana', { password: 'anything' }).then(
            () => 'in',
            () => 'out',
          ),
        )
        .toBe('in')
      await expect(lobby.install()).rejects.toThrow(/the lobby let ana in with a wrong password; its pg_hba.conf must demand scram-sha-256/)
    } finally {
      await write(before?.text ?? '')
    }
    await expect
      .poll(() =>
        lobby.analyst('ana', { password: 'anything' }).then(
          () => 'in',
          () => 'out',
        ),
      )
      .toBe('out')
  })

  test('stops with a remedy where something is in the way', async () => {
    const stranger = ferryPolicies(ferryTables(), [{ ...ferryAnalyst('postgres', 'ferries') }])
    await expect(lobby.install({ policies: stranger })).rejects.toThrow(/a role postgres that Hedgerow did not make; drop that role or give/)
    const itself = ferryPolicies()
    const ferries = itself.dataSets.get('ferries')
    if (ferries === undefined) throw new Error('no ferries')
    const overVault = { ...itself, dataSets: new Map([['ferry_vault', { ...ferries, name: 'ferry_vault' }]]) }
    await expect(lobby.install({ policies: overVault })).rejects.toThrow(/the vault is the database ferry_vault of the lobby's own server/)
    const overLedger = { ...itself, dataSets: new Map([['ferry_ledger', { ...ferries, name: 'ferry_ledger' }]]) }
    const ledger = await lobby.admin('ferry_ledger')
    await ledger.query('CREATE TABLE debits (id int)')
    await expect(lobby.install({ policies: overLedger })).rejects.toThrow(/with tables that Hedgerow did not make/)
    await ledger.query('DROP TABLE debits')
  })
})
