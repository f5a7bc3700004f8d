import { createHash, createHmac, pbkdf2Sync, randomBytes } from 'node:crypto'
import pg from 'pg'
import { installLobby, type LobbyOrder, type LobbyReport } from '../../src/lobby/install.ts'
import type { Analyst, Cap, DataColumn, DataSet, DataTable, Policies } from '../../src/policy/data-set.ts'
import { testBackend } from '../harness/backend.ts'
import { clearLobby } from '../harness/clear-lobby.ts'
import { standInPullPort, type StandInPullPort } from './stand-in-pull-port.ts'

const cap: Cap = { epsilon: '4', delta: '1e-6', renews: 'never' }
const pullPassword = 'between lobby and hedgerow'

/** A PostgreSQL of the test file's own (a lobby owns the roles of its server), with the ferry company's vault, an empty ledger and a stand-in for the pull port. */
export interface FerryLobby {
  readonly pull: StandInPullPort
  readonly policies: Policies
  url(database?: string): string
  install(changes?: Partial<LobbyOrder>): Promise<LobbyReport>
  /** A superuser's session; ended with the lobby. */
  admin(database: string): Promise<pg.Client>
  /** An analyst's session in a database, by default ferries; ended with the lobby. */
  analyst(name: string, options?: { readonly database?: string; readonly password?: string; readonly options?: string }): Promise<pg.Client>
  stop(): Promise<void>
}

export async function ferryLobby(): Promise<FerryLobby> {
  const backend = await testBackend()
  const pull = await standInPullPort(pullPassword)
  const open: pg.Client[] = []
  const policies = ferryPolicies()
  const url = (database = 'postgres'): string => {
    const changed = new URL(backend.url)
    changed.pathname = `/${database}`
    return changed.href
  }
  const connect = async (config: pg.ClientConfig): Promise<pg.Client> => {
    const client = new pg.Client(config)
    client.on('error', () => undefined)
    await client.connect()
    open.push(client)
    return client
  }
  const admin = (database: string): Promise<pg.Client> => connect({ connectionString: url(database) })
  const maintenance = await admin('postgres')
  // On a server of one's own that outlives the run: one file at a time, and nothing of the last one left.
  await maintenance.query('SELECT pg_advisory_lock(4711)')
  await clearLobby(maintenance)
  for (const database of ['ferries', 'harbours', 'ferry_vault', 'ferry_ledger']) await maintenance.query(`DROP DATABASE IF EXISTS ${database} WITH (FORCE)`)
  for (const role of ['ana', 'bo', 'cy', 'porter', 'hedgerow_owner', 'hedgerow_reader']) {
    await maintenance.query(
      `DO $$ BEGIN IF to_regrole('${role}') IS NOT NULL THEN EXECUTE 'DROP OWNED BY ${role}'; EXECUTE 'DROP ROLE ${role}'; END IF; END $$`,
    )
  }
  for (const database of ['ferry_vault', 'ferry_ledger']) await maintenance.query(`CREATE DATABASE ${database} TEMPLATE template0 ENCODING 'UTF8'`)
  const vault = await admin('ferry_vault')
  await vault.query(vaultText)
  return {
    pull,
    policies,
    url,
    admin,
    install: (changes = {}) =>
      installLobby({
        lobbyUrl: url(),
        ledgerUrl: url('ferry_ledger'),
        vaultUrl: url('ferry_vault'),
        policies,
        pull: { host: pull.host, port: pull.port, password: pullPassword },
        ...changes,
      }),
    analyst: (name, { database = 'ferries', password = passwordOf(name), options = '' } = {}) => {
      const { hostname, port } = new URL(backend.url)
      return connect({ host: hostname, port: Number(port), user: name, password, database, options })
    },
    stop: async () => {
      await clearLobby(maintenance)
      await Promise.all(open.map((client) => client.end().catch(() => undefined)))
      await pull.close()
      await backend.stop()
    },
  }
}

export function passwordOf(analyst: string): string {
  return `${analyst}'s password`
}

/** RFC 5802's stored form, as PostgreSQL keeps it. */
export function verifierOf(password: string): string {
  const salt = randomBytes(16)
  const salted = pbkdf2Sync(password, salt, 4096, 32, 'sha256')
  const hmac = (text: string): Buffer => createHmac('sha256', salted).update(text).digest()
  const stored = createHash('sha256').update(hmac('Client Key')).digest('base64')
  return `SCRAM-SHA-256$4096:${salt.toString('base64')}$${stored}:${hmac('Server Key').toString('base64')}`
}

const vaultText = `
CREATE TYPE mood AS ENUM ('calm', 'cross');
CREATE DOMAIN pence AS int4 CHECK (VALUE >= 0);
CREATE TABLE riders (rider_id int4 PRIMARY KEY, full_name text NOT NULL, birth_year int4, mood mood);
CREATE TABLE piers (pier_id text PRIMARY KEY, opened date, note text, share numeric, raw bytea, at timestamptz, ratio float8);
CREATE TABLE trips (trip_id int8 PRIMARY KEY, rider_id int4 NOT NULL REFERENCES riders, from_pier text REFERENCES piers, fare_pence pence, boarded_at timestamptz);
CREATE TABLE complaints (complaint_id int8 PRIMARY KEY, trip_id int8 REFERENCES trips, topic text, words text);
CREATE INDEX piers_opened ON piers (opened);
INSERT INTO piers VALUES ('Northbank', '1901-05-01', E'tab\\there, back\\\\slash, new\\nline, \\\\N', 'NaN', '\\x00ff', '2025-06-01 12:00:00.000001+00', 0.1::float8 + 0.2::float8),
  ('Eastquay', NULL, '', 123456789012345678901234567890.5, NULL, 'infinity', '-Infinity'), ('Saltmarsh', 'infinity', NULL, NULL, '', NULL, 'NaN');
INSERT INTO piers SELECT 'P' || i, '2000-01-01'::date + i, repeat('x', 80), i, NULL, NULL, i FROM generate_series(1, 20000) AS s(i);
INSERT INTO riders SELECT i, 'Rider ' || i, 1950, 'calm' FROM generate_series(1, 50) AS s(i);
INSERT INTO trips SELECT i, 1 + i % 50, 'Northbank', 100, now() FROM generate_series(1, 200) AS s(i);`

function column(name: string, type: string, more: Partial<DataColumn> = {}): DataColumn {
  const plain = { schema: 'pg_catalog', name: type, printed: type, modifier: -1, kind: 'base', labels: [] } as const
  return { name, type: plain, notNull: false, deterministic: true, role: 'listed', clamp: null, step: null, values: null, valuesFrom: null, ...more }
}

function columns(...list: readonly DataColumn[]): ReadonlyMap<string, DataColumn> {
  return new Map(list.map((each) => [each.name, each]))
}

export function ferryTables(): ReadonlyMap<string, DataTable> {
  const bounds = { groups: 12, rows: 20 }
  return new Map<string, DataTable>([
    [
      'public.riders',
      {
        kind: 'private',
        schema: 'public',
        name: 'riders',
        owner: { kind: 'column', column: 'rider_id' },
        bounds: { groups: 1, rows: 1 },
        onePerPerson: true,
        uniqueKeys: [['rider_id']],
        primaryKey: ['rider_id'],
        columns: columns(
          column('rider_id', 'int4', { role: 'linking', notNull: true }),
          column('birth_year', 'int4', { clamp: ['1920', '2020'] }),
          column('mood', 'mood'),
        ),
      },
    ],
    [
      'public.trips',
      {
        kind: 'private',
        schema: 'public',
        name: 'trips',
        owner: { kind: 'column', column: 'rider_id' },
        bounds,
        onePerPerson: false,
        uniqueKeys: [['trip_id']],
        primaryKey: ['trip_id'],
        columns: columns(
          column('trip_id', 'int8', { role: 'linking', notNull: true }),
          column('rider_id', 'int4', { role: 'linking', notNull: true }),
          column('from_pier', 'text', { valuesFrom: { table: 'public.piers', column: 'pier_id' } }),
          column('fare_pence', 'pence', { clamp: ['0', '2500'], step: '1' }),
          column('boarded_at', 'timestamptz'),
        ),
      },
    ],
    [
      'public.complaints',
      {
        kind: 'private',
        schema: 'public',
        name: 'complaints',
        owner: { kind: 'through', steps: [{ column: 'trip_id', table: 'public.trips', referenced: 'trip_id' }], person: 'rider_id' },
        bounds,
        onePerPerson: false,
        uniqueKeys: [['complaint_id']],
        primaryKey: ['complaint_id'],
        columns: columns(column('trip_id', 'int8', { role: 'linking' }), column('topic', 'text', { values: ['late', 'wet'] })),
      },
    ],
    [
      'public.piers',
      {
        kind: 'published',
        schema: 'public',
        name: 'piers',
        uniqueKeys: [['pier_id']],
        primaryKey: ['pier_id'],
        columns: columns(
          column('pier_id', 'text', { notNull: true }),
          column('opened', 'date'),
          column('note', 'text'),
          column('share', 'numeric'),
          column('raw', 'bytea'),
          column('at', 'timestamptz'),
          column('ratio', 'float8'),
        ),
      },
    ],
  ])
}

function dataSet(name: string, tables: ReadonlyMap<string, DataTable>): DataSet {
  return {
    name,
    policyHash: 'a policy',
    schema: 'public',
    personCalled: 'rider',
    personTable: 'public.riders',
    personColumn: 'rider_id',
    personType: column('rider_id', 'int4').type,
    defaults: { epsilon: '0.1', delta: '1e-8' },
    replyAfterMs: 300,
    personKey: 'riders',
    tables,
    hasUndeclaredKeys: true,
  }
}

export function ferryAnalyst(name: string, ...dataSets: readonly string[]): Analyst {
  return { name, login: verifierOf(passwordOf(name)), data: new Map(dataSets.map((each) => [each, cap])) }
}

export function ferryPolicies(
  tables = ferryTables(),
  analysts: readonly Analyst[] = [ferryAnalyst('ana', 'ferries'), ferryAnalyst('bo', 'ferries'), ferryAnalyst('cy', 'harbours')],
): Policies {
  const harbours = new Map([...tables].filter(([, table]) => table.kind === 'published'))
  return {
    dataSets: new Map([
      ['ferries', dataSet('ferries', tables)],
      ['harbours', dataSet('harbours', harbours)],
    ]),
    analysts: new Map(analysts.map((analyst) => [analyst.name, analyst])),
    everyone: new Map([
      ['ferries', cap],
      ['harbours', cap],
    ]),
  }
}

/** The SQLSTATE a statement fails with, or 'no error'. */
export async function failureOf(client: pg.Client, text: string): Promise<string> {
  try {
    await client.query(text)
    return 'no error'
  } catch (error) {
    return error instanceof pg.DatabaseError ? (error.code ?? '') : String(error)
  }
}
