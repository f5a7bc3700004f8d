import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { failureOf, ferryLobby, type FerryLobby } from './ferry-lobby.ts'

let lobby: FerryLobby
let admin: pg.Client

beforeAll(async () => {
  lobby = await ferryLobby()
  const report = await lobby.install()
  expect(report).toMatchObject({ created: ['ferries', 'harbours'], removed: [], ended: [], warnings: [] })
  admin = await lobby.admin('ferries')
})
afterAll(() => lobby.stop())

const definitions = `
  SELECT n.nspname || '.' || c.relname AS what, c.relowner::regrole::text || ' ' || coalesce(c.relacl::text, '') || ' ' || c.relrowsecurity || c.relforcerowsecurity || ' ' ||
         (SELECT string_agg(a.attname || ' ' || format_type(a.atttypid, a.atttypmod) || ' ' || a.attnotnull || ' ' || coalesce(col_description(c.oid, a.attnum), ''), ', ' ORDER BY a.attnum)
            FROM pg_attribute a WHERE a.attrelid = c.oid AND a.attnum > 0) AS how
    FROM pg_class c JOIN pg_namespace n ON n.oid = c.relnamespace WHERE n.nspname IN ('public', 'hedgerow', 'hedgerow_inside') AND c.relkind IN ('r', 'v', 'i')
  UNION ALL SELECT conname, pg_get_constraintdef(oid) FROM pg_constraint WHERE connamespace = 'public'::regnamespace AND contype IN ('p', 'u', 'f')
  UNION ALL SELECT oid::regprocedure::text, coalesce(proacl::text, '') || proowner::regrole FROM pg_proc WHERE pronamespace IN ('hedgerow'::regnamespace, 'hedgerow_inside'::regnamespace)
  UNION ALL SELECT datname, datacl::text FROM pg_database
  UNION ALL SELECT rolname, rolcanlogin || coalesce(rolpassword, '') || rolconnlimit || rolinherit FROM pg_authid
  UNION ALL SELECT setrole || '/' || setdatabase, setconfig::text FROM pg_db_role_setting
  ORDER BY 1, 2`

describe('the shells', () => {
  test("hold the visible columns with the vault's types, keys and NOT NULLs, and state the policy in comments", async () => {
    const columns = await admin.query({
      text: `SELECT c.relname || '.' || a.attname || ' ' || format_type(a.atttypid, a.atttypmod) || CASE WHEN a.attnotnull THEN ' not null' ELSE '' END FROM pg_class c JOIN pg_attribute a ON a.attrelid = c.oid
        WHERE c.relnamespace = 'public'::regnamespace AND c.relkind = 'r' AND a.attnum > 0 AND c.relname <> 'piers' ORDER BY c.relname, a.attnum`,
      rowMode: 'array',
    })
    expect(columns.rows.flat()).toEqual([
      'complaints.trip_id bigint',
      'complaints.topic text',
      'riders.rider_id integer not null',
      'riders.birth_year integer',
      'riders.mood mood',
      'trips.trip_id bigint not null',
      'trips.rider_id integer not null',
      'trips.from_pier text',
      'trips.fare_pence pence',
      'trips.boarded_at timestamp with time zone',
    ])
    const keys = await admin.query({
      text: "SELECT conname FROM pg_constraint WHERE connamespace = 'public'::regnamespace AND contype IN ('p', 'f') ORDER BY 1",
      rowMode: 'array',
    })
    expect(keys.rows.flat()).toEqual(['complaints_trip_id_fkey', 'piers_pkey', 'riders_pkey', 'trips_from_pier_fkey', 'trips_pkey', 'trips_rider_id_fkey'])
    const comments = await admin.query({
      text: "SELECT obj_description('trips'::regclass), col_description('trips'::regclass, 2), col_description('trips'::regclass, 3), col_description('trips'::regclass, 4)",
      rowMode: 'array',
    })
    expect(comments.rows[0]).toEqual([
      "private, a rider's rows by rider_id: only aggregates are answered; a rider counts in at most 12 groups, with at most 20 rows in each",
      'linking: usable in joins and distinct counts, not in output',
      'values from public.piers.pier_id',
      'clamp 0 to 2500; step 1',
    ])
  })

  test('raise 42501 at any scan and give no empty answer, whatever row_security says', async () => {
    for (const rowSecurity of ['off', 'on']) {
      const ana = await lobby.analyst('ana')
      await ana.query(`SET row_security = ${rowSecurity}; SET enable_seqscan = ${rowSecurity}; CREATE TEMP TABLE mine AS SELECT 1 AS a`)
      const scans = [
        'SELECT * FROM riders',
        'TABLE riders',
        'SELECT count(*) FROM trips',
        'SELECT min(trip_id), max(trip_id) FROM trips',
        'SELECT * FROM riders WHERE rider_id = 3',
        'SELECT rider_id FROM riders ORDER BY rider_id LIMIT 1',
        "SELECT ctid FROM riders WHERE ctid = '(0,1)'",
        'SELECT * FROM riders TABLESAMPLE system (10)',
        'SELECT EXISTS (SELECT FROM riders)',
        'SELECT a FROM mine WHERE a NOT IN (SELECT rider_id FROM riders)',
        'SELECT a FROM mine WHERE EXISTS (SELECT FROM riders WHERE rider_id = a)',
        'SELECT (SELECT max(birth_year) FROM riders), a FROM mine',
        'SELECT * FROM mine LEFT JOIN trips ON rider_id = a',
        'SELECT * FROM mine FULL JOIN riders ON rider_id = a',
        'SELECT * FROM riders JOIN trips USING (rider_id)',
        'SELECT a FROM mine UNION ALL SELECT rider_id FROM riders',
        'SELECT a FROM mine INTERSECT SELECT rider_id FROM riders',
        'WITH r AS MATERIALIZED (SELECT * FROM riders) SELECT count(*) FROM mine, r',
        'SELECT * FROM riders, LATERAL (SELECT rider_id) x',
        'COPY riders TO STDOUT',
        'COPY (SELECT rider_id FROM riders) TO STDOUT',
        'DO $$ BEGIN PERFORM FROM riders; END $$',
        "DO $$ DECLARE n int; BEGIN EXECUTE 'SELECT count(*) FROM riders' INTO n; END $$",
        'CREATE TEMP TABLE taken AS SELECT * FROM riders',
        'INSERT INTO mine SELECT rider_id FROM riders',
        'DELETE FROM mine USING riders WHERE rider_id = a',
      ]
      for (const scan of scans) expect({ rowSecurity, scan, code: await failureOf(ana, scan) }).toEqual({ rowSecurity, scan, code: '42501' })
      await ana.query('BEGIN')
      const cursor = await failureOf(ana, 'DECLARE c CURSOR FOR SELECT * FROM riders')
      expect(cursor === 'no error' ? await failureOf(ana, 'FETCH c') : cursor).toBe('42501')
      await ana.query('ROLLBACK')
      await ana.query('CREATE TEMP VIEW seen AS SELECT * FROM riders')
      expect(await failureOf(ana, 'SELECT * FROM seen')).toBe('42501')
      await ana.query("CREATE FUNCTION pg_temp.peek() RETURNS bigint LANGUAGE sql AS 'SELECT count(*) FROM public.riders'").catch(() => undefined)
      expect(await failureOf(ana, 'SELECT pg_temp.peek()')).toBe(rowSecurity === 'on' ? '42501' : '42883')
      for (const plan of ['force_generic_plan', 'force_custom_plan']) {
        const prepared = await failureOf(
          ana,
          `DEALLOCATE ALL; SET plan_cache_mode = ${plan}; PREPARE p AS SELECT * FROM riders WHERE rider_id = $1; EXECUTE p(1)`,
        )
        expect(prepared).toBe('42501')
      }
    }
  })

  test('cannot be written, emptied, altered or analysed by an analyst', async () => {
    const ana = await lobby.analyst('ana')
    for (const text of [
      'INSERT INTO riders (rider_id) VALUES (1)',
      'UPDATE riders SET birth_year = 1',
      'DELETE FROM riders',
      'TRUNCATE riders',
      'ALTER TABLE riders DISABLE ROW LEVEL SECURITY',
      'ALTER POLICY people_stay_inside ON riders USING (true)',
      'DROP TABLE riders',
      'BEGIN; LOCK TABLE riders IN ACCESS EXCLUSIVE MODE',
      'SELECT * FROM riders FOR UPDATE',
      'CREATE INDEX ON riders (birth_year)',
      'DELETE FROM piers',
    ]) {
      expect({ text, code: await failureOf(ana, text) }).toEqual({ text, code: '42501' })
      await ana.query('ROLLBACK')
    }
  })
})

describe('published tables', () => {
  test('are copied exactly, with keys and indexes, and free to read', async () => {
    const ana = await lobby.analyst('ana')
    const vault = await lobby.admin('ferry_vault')
    const digest = 'SELECT count(*), md5(string_agg(p::text, \'|\' ORDER BY pier_id COLLATE "C")) FROM piers p'
    for (const session of [ana, vault]) await session.query("SET TimeZone = 'UTC'")
    expect((await ana.query(digest)).rows).toEqual((await vault.query(digest)).rows)
    const indexes = await admin.query({
      text: "SELECT indexrelid::regclass::text FROM pg_index WHERE indrelid = 'piers'::regclass ORDER BY 1",
      rowMode: 'array',
    })
    expect(indexes.rows.flat()).toEqual(['piers_opened', 'piers_pkey'])
    expect((await admin.query("SELECT reltuples > 20000 AS analysed FROM pg_class WHERE oid = 'piers'::regclass")).rows).toEqual([{ analysed: true }])
  })
})

describe('an analyst', () => {
  test('enters the own data sets only, with the password only', async () => {
    await lobby.analyst('cy', { database: 'harbours' })
    for (const [name, database] of [
      ['ana', 'harbours'],
      ['cy', 'ferries'],
      ['ana', 'postgres'],
      ['ana', 'template1'],
      ['ana', 'ferry_ledger'],
      ['ana', 'ferry_vault'],
    ] as const) {
      await expect(lobby.analyst(name, { database })).rejects.toMatchObject({ code: '42501' })
    }
    await expect(lobby.analyst('ana', { password: 'wrong' })).rejects.toMatchObject({ code: '28P01' })
    await expect(lobby.analyst('hedgerow_owner', { password: '' })).rejects.toThrow()
  })

  test('finds the limits of the role and the defaults of the data set in the session', async () => {
    const ana = await lobby.analyst('ana')
    const show = async (name: string): Promise<string> => (await ana.query<Record<string, string>>(`SHOW ${name}`)).rows[0]?.[name] ?? ''
    const wanted = {
      row_security: 'off',
      statement_timeout: '5min',
      temp_file_limit: '2GB',
      client_connection_check_interval: '500ms',
      log_min_messages: 'fatal',
      log_min_error_statement: 'panic',
      'hedgerow.epsilon': '0.1',
      'hedgerow.delta': '1e-8',
      'hedgerow.confidence': '0.95',
      'hedgerow.noise': 'auto',
      'hedgerow.margin': '',
    }
    for (const [name, value] of Object.entries(wanted)) expect({ name, value: await show(name) }).toEqual({ name, value })
    for (const text of ['SET temp_file_limit = -1', "SET log_min_messages = 'debug5'", "SET log_statement = 'all'"])
      expect(await failureOf(ana, text)).toBe('42501')
  })

  test('makes temporary objects and no others', async () => {
    const ana = await lobby.analyst('ana')
    await ana.query('CREATE TEMP TABLE mine (a int); CREATE TEMP VIEW seen AS SELECT * FROM mine; CREATE TEMP SEQUENCE s')
    for (const text of [
      'CREATE TABLE public.mine (a int)',
      'CREATE TABLE hedgerow.mine (a int)',
      'CREATE SCHEMA mine',
      'CREATE FUNCTION public.f() RETURNS int LANGUAGE sql AS $$SELECT 1$$',
      'CREATE VIEW public.v AS SELECT 1',
      'CREATE DATABASE mine',
      'CREATE ROLE mine',
      'CREATE EXTENSION pgcrypto',
      'CREATE SERVER s FOREIGN DATA WRAPPER dblink_fdw',
      'CREATE PUBLICATION p',
      'CREATE TYPE public.t AS (a int)',
      'GRANT ana TO bo',
    ]) {
      expect({ text, code: await failureOf(ana, text) }).toEqual({ text, code: '42501' })
    }
  })

  test('is a member of no role, and takes nothing from others with DROP OWNED', async () => {
    const bo = await lobby.analyst('bo')
    expect((await admin.query("SELECT FROM pg_auth_members WHERE member = 'bo'::regrole")).rows).toEqual([])
    for (const text of [
      'DROP OWNED BY hedgerow_owner',
      'DROP OWNED BY ana',
      'SET ROLE hedgerow_owner',
      'SET ROLE hedgerow_reader',
      'SET SESSION AUTHORIZATION ana',
    ]) {
      expect({ text, code: await failureOf(bo, text) }).toEqual({ text, code: '42501' })
    }
    await bo.query('DROP OWNED BY bo')
    expect(await failureOf(await lobby.analyst('ana'), 'SELECT * FROM piers LIMIT 1')).toBe('no error')
    await lobby.install()
    await lobby.analyst('bo')
  })

  test('reaches no large objects, files, advisory locks, log messages, snapshots, text-to-query functions or dblink', async () => {
    const ana = await lobby.analyst('ana')
    for (const call of [
      'lo_create(0)',
      "lo_from_bytea(0, '\\x00')",
      'lo_creat(-1)',
      'lo_get(1)',
      'lo_open(1, 131072)',
      'loread(0, 1)',
      "lowrite(0, '')",
      "lo_import('/etc/passwd')",
      "pg_read_file('PG_VERSION')",
      "pg_ls_dir('.')",
      "pg_stat_file('PG_VERSION')",
      'pg_advisory_lock(1)',
      'pg_advisory_xact_lock_shared(1, 2)',
      'pg_try_advisory_lock(1)',
      'pg_advisory_unlock_all()',
      "pg_logical_emit_message(false, 'a', 'b')",
      'pg_export_snapshot()',
      "query_to_xml('SELECT 1', true, false, '')",
      "table_to_xml('piers', true, false, '')",
      "schema_to_xml('public', true, false, '')",
      "database_to_xml(true, false, '')",
      "query_to_xmlschema('SELECT 1', true, false, '')",
      "cursor_to_xml('c', 1, true, false, '')",
      'hedgerow_inside.dblink_get_connections()',
      "hedgerow_inside.ask('budget', '', '[]', '[]')",
      "dblink_connect('hedgerow_pull')",
    ]) {
      const code = await failureOf(ana, `SELECT ${call}`)
      expect({ call, code }).toEqual({ call, code: call.startsWith('dblink') ? '42883' : '42501' })
    }
  })

  test("sees neither the pull port's password nor what others run", async () => {
    const ana = await lobby.analyst('ana')
    const bo = await lobby.analyst('bo')
    const running = bo.query("SELECT pg_sleep(0.3), 'a secret of bo'")
    const seen = await ana.query("SELECT query FROM pg_stat_activity WHERE usename <> 'ana'")
    expect(seen.rows.length).toBeGreaterThan(0)
    expect(JSON.stringify(seen.rows)).not.toContain('secret')
    await running
    expect(await failureOf(ana, 'SELECT * FROM pg_user_mapping')).toBe('42501')
    expect((await ana.query('SELECT umoptions FROM pg_user_mappings')).rows).toEqual([{ umoptions: null }])
    await ana.query("SELECT hedgerow.pull('x', '[]')")
    expect(await failureOf(ana, "SELECT hedgerow_inside.dblink_send_query('hedgerow_pull', 'pull {}')")).toBe('42501')
  })

  test('cannot make the own session outlive a change: password, settings and memberships are put back at the next load', async () => {
    const before = (await admin.query({ text: definitions, rowMode: 'array' })).rows
    const ana = await lobby.analyst('ana')
    await ana.query("ALTER ROLE ana PASSWORD 'mine now'")
    await ana.query(
      "ALTER ROLE ana RESET ALL; ALTER ROLE ana SET row_security = on; ALTER ROLE ana IN DATABASE ferries SET statement_timeout = 0; ALTER ROLE ana SET work_mem = '1GB'",
    )
    await admin.query('CREATE ROLE deckhands; GRANT deckhands TO ana')
    await admin.query(
      'ALTER ROLE ana CREATEDB CREATEROLE CONNECTION LIMIT -1; GRANT CONNECT ON DATABASE ferry_ledger TO ana; GRANT CONNECT ON DATABASE postgres TO PUBLIC',
    )
    await lobby.analyst('ana', { password: 'mine now' })
    await lobby.install()
    await admin.query('DROP ROLE deckhands')
    expect((await admin.query({ text: definitions, rowMode: 'array' })).rows).toEqual(before)
    await expect(lobby.analyst('ana', { password: 'mine now' })).rejects.toMatchObject({ code: '28P01' })
    await lobby.analyst('ana')
  })
})
