import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { connectLobby, type LobbyClient } from '../../src/lobby/client.ts'
import type { Policies } from '../../src/policy/data-set.ts'
import { failureOf, ferryLobby, ferryPolicies, type FerryLobby } from './ferry-lobby.ts'

let lobby: FerryLobby
let client: LobbyClient
let lobbyUrl: string

const whole = ferryPolicies()
const policies: Policies = { ...whole, dataSets: new Map([...whole.dataSets].filter(([name]) => name === 'ferries')) }

beforeAll(async () => {
  lobby = await ferryLobby()
  const admin = await lobby.admin('postgres')
  await admin.query("CREATE ROLE porter LOGIN CREATEROLE CREATEDB PASSWORD 'keys'; GRANT CONNECT ON DATABASE postgres TO porter")
  const url = new URL(lobby.url('postgres'))
  url.username = 'porter'
  url.password = 'keys'
  lobbyUrl = url.href
})
afterAll(async () => {
  await client?.close()
  await lobby?.stop()
})

describe('a lobby made by a role with CREATEROLE and CREATEDB', () => {
  test('says what a superuser has to do first, then works and says what stayed open', async () => {
    await expect(lobby.install({ lobbyUrl, policies })).rejects.toThrow(
      /run there: CREATE EXTENSION dblink SCHEMA hedgerow_inside; GRANT USAGE ON FOREIGN DATA WRAPPER dblink_fdw TO/,
    )
    const admin = await lobby.admin('ferries')
    await admin.query('CREATE EXTENSION dblink SCHEMA hedgerow_inside; GRANT USAGE ON FOREIGN DATA WRAPPER dblink_fdw TO porter')
    const report = await lobby.install({ lobbyUrl, policies })
    const warnings = report.warnings.join('\n')
    for (const part of ['GRANT SET ON PARAMETER temp_file_limit', 'pg_advisory_lock(bigint)', 'REVOKE CONNECT ON DATABASE "ferry_ledger" FROM PUBLIC'])
      expect(warnings).toContain(part)
    await admin.query(/have a superuser run in ferries: (.*)/.exec(warnings)?.[1] ?? '')
    for (const database of ['postgres', 'template1', 'template0', 'ferry_vault', 'ferry_ledger'])
      await admin.query(`REVOKE CONNECT, TEMPORARY ON DATABASE ${database} FROM PUBLIC`)
    for (const [, parameter] of warnings.matchAll(/GRANT SET ON PARAMETER (\S+)/g)) await admin.query(`GRANT SET ON PARAMETER ${parameter} TO porter`)
    expect((await lobby.install({ lobbyUrl, policies })).warnings).toEqual([])
  })

  test('answers pulls, keeps its shells shut, and ends sessions that hold a load up', async () => {
    lobby.pull.answerWith(async () => ({ kind: 'rows', rows: [{ c1: '7' }], notice: '' }))
    const ana = await lobby.analyst('ana')
    expect((await ana.query("SELECT c1 FROM jsonb_to_recordset(hedgerow.pull('x', '[]')) AS r(c1 int8)")).rows).toEqual([{ c1: '7' }])
    await ana.query('SET row_security = on')
    expect(await failureOf(ana, 'SELECT * FROM trips')).toBe('42501')
    expect(await failureOf(ana, 'SELECT hedgerow_inside.dblink_get_connections()')).toBe('42501')
    await ana.query('BEGIN; SELECT * FROM piers LIMIT 1')
    expect((await lobby.install({ lobbyUrl, policies })).ended).toEqual(['ana'])
  })
})

describe('describing a text', () => {
  beforeAll(() => {
    client = connectLobby({ lobbyUrl, connections: 2 })
  })

  test("gives parameters and columns with PostgreSQL's types, and runs nothing", async () => {
    const text =
      'SELECT count(*) AS n, mood, sum(fare_pence), avg(fare_pence), max(boarded_at), min(from_pier) FROM riders JOIN trips USING (rider_id) WHERE birth_year > $1 AND mood = $2 GROUP BY mood'
    expect(await client.describe('ferries', text, [])).toEqual({
      kind: 'described',
      parameters: ['integer', 'public.mood'],
      columns: [
        { name: 'n', type: 'bigint' },
        { name: 'mood', type: 'public.mood' },
        { name: 'sum', type: 'bigint' },
        { name: 'avg', type: 'numeric' },
        { name: 'max', type: 'timestamp with time zone' },
        { name: 'min', type: 'text' },
      ],
    })
    const described = await client.describe('ferries', 'SELECT $1 AS a, 1.5::numeric(10,2) AS b, pg_sleep(60)', [23])
    expect(described).toMatchObject({
      kind: 'described',
      parameters: ['integer'],
      columns: [
        { name: 'a', type: 'integer' },
        { name: 'b', type: 'numeric(10,2)' },
        { name: 'pg_sleep', type: 'void' },
      ],
    })
    expect(await client.describe('ferries', 'SET row_security = off', [])).toEqual({ kind: 'described', parameters: [], columns: [] })
    expect(await client.describe('ferries', 'SELECT rider_id FROM riders', [])).toMatchObject({ kind: 'described' })
  })

  test("passes PostgreSQL's complaint on, with its place", async () => {
    expect(await client.describe('ferries', 'SELECT nope FROM riders', [])).toEqual({
      kind: 'complaint',
      sqlstate: '42703',
      message: 'column "nope" does not exist',
      position: 8,
    })
    expect(await client.describe('ferries', 'SELECT full_name FROM riders', [])).toMatchObject({ kind: 'complaint', sqlstate: '42703' })
    expect(await client.describe('ferries', 'SELEC 1', [])).toMatchObject({ kind: 'complaint', sqlstate: '42601', position: 1 })
    expect(await client.describe('ferries', 'SELECT 1; SELECT 2', [])).toMatchObject({ kind: 'complaint', sqlstate: '42601' })
    expect(await client.describe('ferries', 'SELECT $1', [999_999])).toMatchObject({ kind: 'complaint' })
  })

  test('serves more callers than connections, and survives connections that were ended', async () => {
    const many = await Promise.all(Array.from({ length: 20 }, (_, at) => client.describe('ferries', `SELECT ${at} AS c${at}`, [])))
    expect(many.map((each) => (each.kind === 'described' ? each.columns[0]?.name : each))).toEqual(Array.from({ length: 20 }, (_, at) => `c${at}`))
    const admin = await lobby.admin('ferries')
    await admin.query("SELECT pg_terminate_backend(pid) FROM pg_stat_activity WHERE usename = 'porter'")
    await expect.poll(async () => (await client.describe('ferries', 'SELECT 1', []).catch(() => ({ kind: 'broken' }))).kind).toBe('described')
  })
})

describe('reading published data', () => {
  test('gives every value as text, under the asked time zone, up to the ceiling', async () => {
    const text = 'SELECT pier_id, opened, share, raw, at, ratio FROM public.piers WHERE pier_id = ANY ($1::text[]) ORDER BY pier_id'
    expect(await client.published('ferries', text, ['{Northbank,Eastquay}'], 'Asia/Kathmandu', 2)).toEqual([
      ['Eastquay', null, '123456789012345678901234567890.5', null, 'infinity', '-Infinity'],
      ['Northbank', '1901-05-01', 'NaN', '\\x00ff', '2025-06-01 17:45:00.000001+05:45', '0.30000000000000004'],
    ])
    expect(await client.published('ferries', text, ['{Northbank,Eastquay}'], 'UTC', 1)).toBe('too-many')
    expect(await client.published('ferries', "SELECT note FROM public.piers WHERE pier_id = 'Northbank'", [], 'UTC', 1)).toEqual([
      ['tab\there, back\\slash, new\nline, \\N'],
    ])
  })

  test('reads published tables only, changes nothing, and has a time limit', async () => {
    const refused = async (text: string): Promise<string> =>
      client.published('ferries', text, [], 'UTC', 10).then(
        () => 'no error',
        (error: unknown) => (error instanceof pg.DatabaseError ? (error.code ?? '') : String(error)),
      )
    expect(await refused('SELECT * FROM trips')).toBe('42501')
    expect(await refused('SELECT * FROM hedgerow_inside.made')).toBe('42501')
    expect(await refused("SELECT nextval('nope')")).toBe('42P01')
    const hasty = connectLobby({ lobbyUrl, statementTimeoutMs: 100 })
    await expect(hasty.published('ferries', 'SELECT pg_sleep(5)', [], 'UTC', 1)).rejects.toMatchObject({ code: '57014' })
    await hasty.close()
  })
})
