import { afterAll, beforeAll, expect, test } from 'vitest'
import type pg from 'pg'
import { frame, int32 } from '../../src/wire/messages.ts'
import { passwordOf, type TestHedgerow } from '../harness/hedgerow.ts'
import { extended, fields, query, RawClient, type Received, sync } from '../wire/raw-client.ts'
import { ferries } from './ferries.ts'

let server: TestHedgerow
let watcher: pg.Client
beforeAll(async () => {
  server = await ferries()
  watcher = await server.connect('ana')
})
afterAll(() => server.stop())

async function raw(): Promise<RawClient> {
  const client = await RawClient.open(server.hedgerow.port)
  await client.logIn('ana', server.dataSet, passwordOf('ana'))
  return client
}

async function charges(): Promise<number> {
  return Number((await watcher.query('SELECT count(*) FROM hedgerow.charges')).rows[0].count)
}

function int16(value: number): Buffer {
  const bytes = Buffer.alloc(2)
  bytes.writeInt16BE(value)
  return bytes
}

function parse(name: string, text: string, types: readonly number[] = []): Buffer {
  return frame('P', Buffer.from(`${name}\0${text}\0`), int16(types.length), ...types.map(int32))
}

function bind(
  portal: string,
  name: string,
  values: readonly (string | Buffer | null)[],
  formats: { readonly values?: 0 | 1; readonly results?: 0 | 1 } = {},
): Buffer {
  const each = values.map((value) => (value === null ? int32(-1) : Buffer.concat([int32(Buffer.byteLength(value)), Buffer.from(value)])))
  return frame(
    'B',
    Buffer.from(`${portal}\0${name}\0`),
    int16(1),
    int16(formats.values ?? 0),
    int16(values.length),
    ...each,
    int16(1),
    int16(formats.results ?? 0),
  )
}

const describe = (what: 'S' | 'P', name = ''): Buffer => frame('D', Buffer.from(`${what}${name}\0`))
const execute = (portal = '', rows = 0): Buffer => frame('E', Buffer.from(`${portal}\0`), int32(rows))
const close = (what: 'S' | 'P', name: string): Buffer => frame('C', Buffer.from(`${what}${name}\0`))

function row(received: Received): readonly (string | null)[] {
  return values(received).map((value) => value?.toString('utf8') ?? null)
}

function values(received: Received): readonly (Buffer | null)[] {
  const out: (Buffer | null)[] = []
  let at = 2
  for (let i = received.body.readInt16BE(0); i > 0; i -= 1) {
    const length = received.body.readInt32BE(at)
    at += 4
    out.push(length < 0 ? null : received.body.subarray(at, at + length))
    at += Math.max(0, length)
  }
  return out
}

function rows(received: readonly Received[]): readonly (readonly (string | null)[])[] {
  return received.filter((each) => each.type === 'D').map(row)
}

const types = (received: readonly Received[]): string =>
  received
    .map((each) => each.type)
    .filter((type) => type !== 'N' && type !== 'S')
    .join('')
const tags = (received: readonly Received[]): readonly string[] =>
  received.filter((each) => each.type === 'C').map((each) => each.body.toString('utf8').replace(/\0$/, ''))
const errorOf = (received: readonly Received[]): Readonly<Record<string, string>> => fields(received.find((each) => each.type === 'E'))

test('Describe of a statement and of a portal gives types and columns, asks the vault nothing and costs nothing', async () => {
  const client = await raw()
  const before = await charges()
  const vault = await server.vault()
  const scans = async (): Promise<string> =>
    (
      await vault.query(
        "SELECT pg_stat_force_next_flush(), pg_stat_clear_snapshot(), seq_scan + coalesce(idx_scan, 0) AS n FROM pg_stat_user_tables WHERE relname = 'trips'",
      )
    ).rows[0].n as string
  const scanned = await scans()
  client.send(parse('s', 'SELECT day, count(*), avg(weight) AS mean FROM trips WHERE fare > $1 AND pier = $2 GROUP BY day'), describe('S', 's'), sync)
  const described = await client.until('Z')
  expect(types(described)).toBe('1tTZ')
  const parameters = described.find((each) => each.type === 't')!.body
  expect([parameters.readInt16BE(0), parameters.readInt32BE(2), parameters.readInt32BE(6)]).toEqual([2, 23, 25])
  const columns = described.find((each) => each.type === 'T')!.body.toString('latin1')
  for (const name of ['day', 'count', 'mean']) expect(columns).toContain(`${name}\0`)
  client.send(bind('p', 's', ['3', 'p1']), describe('P', 'p'), close('P', 'p'), sync)
  expect(types(await client.until('Z'))).toBe('2T3Z')
  expect(await charges()).toBe(before)
  expect(await scans()).toBe(scanned)
})

test('one Parse serves many Executes, each with its own parameter, and two open portals keep theirs apart', async () => {
  const client = await raw()
  client.send(parse('s', 'SELECT count(*) FROM riders WHERE birth_year >= $1'), sync)
  await client.until('Z')
  client.send(...[1950, 1960, 1970, 1960].flatMap((year) => [bind('', 's', [String(year)]), execute()]), sync)
  expect(rows(await client.until('Z'))).toEqual([['300'], ['240'], ['180'], ['240']])
  client.send(query('BEGIN'))
  await client.until('Z')
  client.send(bind('one', 's', ['1950']), bind('two', 's', ['1990']), execute('two'), execute('one'), sync)
  expect(rows(await client.until('Z'))).toEqual([['60'], ['300']])
  client.send(query('COMMIT'))
  expect(tags(await client.until('Z'))).toEqual(['COMMIT'])
})

test('a portal with a row limit is suspended and goes on, in one release', async () => {
  const client = await raw()
  const before = await charges()
  client.send(query('BEGIN'))
  await client.until('Z')
  client.send(parse('', 'SELECT day, count(*) FROM trips GROUP BY day ORDER BY day'), bind('p', '', []), execute('p', 2), execute('p', 3), sync)
  const first = await client.until('Z')
  expect(types(first)).toBe('12DDsDDDsZ')
  expect(rows(first)[0]).toEqual(['2026-01-01', '24'])
  client.send(execute('p'), sync)
  const rest = await client.until('Z')
  expect(types(rest)).toMatch(/^D+CZ$/)
  expect(await charges()).toBe(before + 1)
})

test('pipelined statements answer in order, and after a refusal the rest is skipped until Sync', async () => {
  const client = await raw()
  const before = await charges()
  client.send(extended('SELECT count(*) FROM riders'), extended('SELECT 7'), extended('SELECT count(*) FROM trips'), sync)
  expect(rows(await client.until('Z'))).toEqual([['300'], ['7'], ['3000']])
  client.send(extended('SELECT 8'), extended('SELECT * FROM trips'), extended('SELECT count(*) FROM riders'), sync, extended('SELECT 9'), sync)
  const refused = await client.until('Z')
  expect(types(refused)).toBe('12TDCEZ')
  expect(errorOf(refused)).toMatchObject({ C: '42501', M: expect.stringContaining('[rows.private]') as string })
  expect(rows(await client.until('Z'))).toEqual([['9']])
  expect(await charges()).toBe(before + 2)
})

test('a simple Query of several statements runs them in order; one refused in the middle ends it, with its place in the whole text', async () => {
  const client = await raw()
  client.send(query("SELECT 1; SELECT count(*) FROM riders; SELECT 'a;b' AS s; SELECT count(*) FROM trips WHERE pier = 'p1'"))
  expect(rows(await client.until('Z'))).toEqual([['1'], ['300'], ['a;b'], ['750']])
  const before = await charges()
  const text = 'SELECT 1; /* ü */ SELECT fare FROM trips; SELECT count(*) FROM riders'
  client.send(query(text))
  const refused = await client.until('Z')
  expect(types(refused)).toBe('TDCEZ')
  expect(errorOf(refused)).toMatchObject({ C: '42501', P: String(text.indexOf('trips') + 1) })
  expect(await charges()).toBe(before)
})

test('a refusal aborts the transaction as any error does; a savepoint takes it back', async () => {
  const client = await raw()
  const ask = async (text: string): Promise<readonly Received[]> => {
    client.send(query(text))
    return client.until('Z')
  }
  const state = (received: readonly Received[]): string => received.at(-1)!.body.toString('latin1')
  await ask('BEGIN')
  expect(state(await ask('SELECT * FROM trips'))).toBe('E')
  expect(errorOf(await ask('SELECT count(*) FROM trips'))).toMatchObject({ C: '25P02' })
  expect(errorOf(await ask('SELECT * FROM trips'))).toMatchObject({ C: '25P02' })
  expect(tags(await ask('COMMIT'))).toEqual(['ROLLBACK'])
  await ask('BEGIN')
  await ask('SAVEPOINT here')
  expect(state(await ask('SELECT rider_id, count(*) FROM trips GROUP BY rider_id'))).toBe('E')
  await ask('ROLLBACK TO here')
  expect(rows(await ask('SELECT count(*) FROM riders'))).toEqual([['300']])
  expect(tags(await ask('COMMIT'))).toEqual(['COMMIT'])
})

test('what a rolled-back transaction asked for stays debited', async () => {
  const client = await raw()
  const before = await charges()
  client.send(query('BEGIN; SELECT count(*) FROM riders; ROLLBACK'))
  await client.until('Z')
  expect(await charges()).toBe(before + 1)
})

test('a cursor pulls once, at its first FETCH', async () => {
  const client = await raw()
  const before = await charges()
  const ask = async (text: string): Promise<readonly Received[]> => {
    client.send(query(text))
    return client.until('Z')
  }
  await ask('BEGIN')
  expect(tags(await ask('DECLARE c SCROLL CURSOR FOR SELECT pier, count(*) FROM trips GROUP BY pier ORDER BY pier'))).toEqual(['DECLARE CURSOR'])
  expect(await charges()).toBe(before)
  expect(rows(await ask('FETCH 2 FROM c'))).toEqual([
    ['p0', '750'],
    ['p1', '750'],
  ])
  expect(rows(await ask('FETCH PRIOR FROM c'))).toEqual([['p0', '750']])
  await ask('COMMIT')
  expect(await charges()).toBe(before + 1)
})

test('COPY (private) TO STDOUT comes in text, CSV and binary', async () => {
  const client = await raw()
  const copied = async (options: string): Promise<Buffer> => {
    client.send(query(`COPY (SELECT district, count(*)::int FROM riders GROUP BY 1 ORDER BY 1) TO STDOUT ${options}`))
    const received = await client.until('Z')
    expect(tags(received)).toEqual(['COPY 4'])
    return Buffer.concat(received.filter((each) => each.type === 'd').map((each) => each.body))
  }
  expect((await copied('')).toString()).toBe('Eastquay\t100\nGullhaven\t0\nNorthbank\t100\nSaltmarsh\t100\n')
  expect((await copied('(FORMAT csv, HEADER)')).toString()).toBe('district,count\nEastquay,100\nGullhaven,0\nNorthbank,100\nSaltmarsh,100\n')
  const binary = await copied('(FORMAT binary)')
  expect(binary.subarray(0, 11).toString('latin1')).toBe('PGCOPY\n\xff\r\n\0')
  expect(binary.includes(Buffer.from('Saltmarsh\0\0\0\x04\0\0\0\x64', 'latin1'))).toBe(true)
})

test('results in binary are those PostgreSQL encodes, with binary parameters', async () => {
  const client = await raw()
  client.send(
    parse('', 'SELECT concession, count(*), 1.5::float8 FROM riders WHERE birth_year >= $1 GROUP BY 1 ORDER BY 1', [23]),
    bind('', '', [int32(1960)], { values: 1, results: 1 }),
    execute(),
    sync,
  )
  const received = (await client.until('Z')).filter((each) => each.type === 'D').map(values)
  expect(received.map(([concession, count]) => [concession?.[0], count?.readBigInt64BE(0)])).toEqual([
    [0, 180n],
    [1, 60n],
    [undefined, 0n],
  ])
})

test('CREATE TEMP TABLE AS and SELECT INTO keep their command tags, and what they hold is read for free', async () => {
  const client = await raw()
  const ask = async (text: string): Promise<readonly Received[]> => {
    client.send(query(text))
    return client.until('Z')
  }
  expect(tags(await ask('CREATE TEMP TABLE kept AS SELECT pier, count(*) AS trips FROM trips GROUP BY pier'))).toEqual(['SELECT 6'])
  expect(tags(await ask('SELECT district, count(*) INTO TEMP kept2 FROM riders GROUP BY district'))).toEqual(['SELECT 4'])
  expect(tags(await ask('INSERT INTO kept SELECT pier, count(*) FROM trips GROUP BY pier'))).toEqual(['INSERT 0 6'])
  const before = await charges()
  expect(rows(await ask('SELECT sum(trips) FROM kept'))).toEqual([['6000']])
  expect(tags(await ask('CREATE TEMP TABLE bare AS SELECT count(*) FROM trips WITH NO DATA'))).toEqual(['CREATE TABLE AS'])
  expect(await charges()).toBe(before)
})

test('a temporary view over a private query pulls each time it is read', async () => {
  const client = await raw()
  const ask = async (text: string): Promise<readonly Received[]> => {
    client.send(query(text))
    return client.until('Z')
  }
  expect(tags(await ask('CREATE TEMP VIEW by_pier AS SELECT pier, count(*) AS trips FROM trips GROUP BY pier'))).toEqual(['CREATE VIEW'])
  const before = await charges()
  expect(rows(await ask("SELECT trips FROM by_pier WHERE pier = 'p1'"))).toEqual([['750']])
  expect(rows(await ask('SELECT count(*) FROM by_pier'))).toEqual([['6']])
  expect(await charges()).toBe(before + 2)
})

test('SQL-level PREPARE and EXECUTE follow their parameters', async () => {
  const client = await raw()
  client.send(query('PREPARE q(int) AS SELECT count(*) FROM riders WHERE birth_year >= $1; EXECUTE q(1960); EXECUTE q(1990); EXECUTE q(NULL)'))
  expect(rows(await client.until('Z'))).toEqual([['240'], ['60'], ['0']])
})

test('EXPLAIN, LIMIT 0, WHERE false, an untaken branch and a list of declared keys are free', async () => {
  const client = await raw()
  const before = await charges()
  const ask = async (text: string): Promise<readonly Received[]> => {
    client.send(query(text))
    return client.until('Z')
  }
  expect(rows(await ask('EXPLAIN SELECT count(*) FROM trips')).length).toBeGreaterThan(3)
  expect(rows(await ask('EXPLAIN (VERBOSE, FORMAT json) SELECT count(*) FROM trips'))).toHaveLength(1)
  expect(rows(await ask('SELECT count(*) FROM trips LIMIT 0'))).toEqual([])
  expect(rows(await ask('SELECT count(*), sum(fare) FROM trips WHERE false'))).toEqual([['0', null]])
  expect(rows(await ask('SELECT CASE WHEN 1 = 2 THEN (SELECT count(*) FROM trips) ELSE -1 END'))).toEqual([['-1']])
  expect(rows(await ask('SELECT DISTINCT district FROM riders ORDER BY 1'))).toHaveLength(4)
  expect(await charges()).toBe(before)
})

test('EXPLAIN takes the statement’s parameters', async () => {
  const client = await raw()
  client.send(extended('EXPLAIN VERBOSE SELECT pier, count(*) + $2::int FROM trips WHERE fare > $1 AND pier <> $3 GROUP BY pier', ['3', '7', 'p9']), sync)
  const lines = rows(await client.until('Z')).map(([line]) => line)
  expect(lines[0]).toBe('Release from trips')
  expect(lines.find((line) => line?.startsWith('  Vault: '))).toContain("'p9'")
})

test('EXPLAIN ANALYZE of a private statement neither runs it nor charges for it', async () => {
  const client = await raw()
  const before = await charges()
  client.send(query('EXPLAIN ANALYZE SELECT count(*) FROM trips'))
  expect(types(await client.until('Z'))).toMatch(/^(TD+C|E)Z$/)
  expect(await charges()).toBe(before)
})
