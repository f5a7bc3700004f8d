import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { frame, int32 } from '../../src/wire/messages.ts'
import { ferries } from '../clients/ferries.ts'
import { passwordOf, type TestHedgerow } from '../harness/hedgerow.ts'
import { extended, fields, query, RawClient, startupPacket, sync } from '../wire/raw-client.ts'

let server: TestHedgerow
let client: pg.Client
beforeAll(async () => {
  server = await ferries()
  client = await server.connect('ana')
})
afterAll(() => server.stop())

async function refusal(text: string, values?: readonly unknown[]): Promise<pg.DatabaseError> {
  const problem: unknown = await client.query(text, values === undefined ? undefined : [...values]).then(
    (result) => new Error(`it was answered: ${JSON.stringify(result)}`),
    (error: unknown) => error,
  )
  expect((await client.query('SELECT 1 AS fine')).rows).toEqual([{ fine: '1' }])
  return problem as pg.DatabaseError
}

async function value(text: string): Promise<unknown> {
  return Object.values((await client.query(text)).rows[0] as object)[0]
}

async function raw(): Promise<RawClient> {
  const each = await RawClient.open(server.hedgerow.port)
  await each.logIn('ana', server.dataSet, passwordOf('ana'))
  return each
}

async function stillServes(): Promise<void> {
  const each = await server.connect('ben')
  expect((await each.query('SELECT count(*) FROM riders')).rows).toEqual([{ count: '300' }])
  await each.end()
}

describe('what PostgreSQL would complain about, it complains about in its own words and places', () => {
  const cases: readonly (readonly [text: string, code: string, message: string, at: string])[] = [
    ['SELECT count(*) FROM trips WHERE fares > 3', '42703', 'column "fares" does not exist', 'fares'],
    ['SELECT sum(trips.nope) FROM trips', '42703', 'column trips.nope does not exist', 'trips.nope'],
    ['SELECT count(*) FROM trips, nowhere', '42P01', 'relation "nowhere" does not exist', 'nowhere'],
    ['SELECT count(*) FROM trips WHERE fare = $$x$$', '22P02', 'invalid input syntax for type integer: "x"', '$$x$$'],
    ['SELECT count(*) FROM trips WHERE fare::nope > 3', '42704', 'type "nope" does not exist', 'nope'],
    ['SELECT count(*) FROM trips WHERE pier > 3', '42883', 'operator does not exist: text > integer', '>'],
    ['SELECT frobnicate(fare) FROM trips', '42883', 'function frobnicate(integer) does not exist', 'frobnicate'],
    ['SELECT count(*) FROM trips GROUP BY 3', '42P10', 'GROUP BY position 3 is not in select list', '3'],
    ['SELECT pier, count(*) FROM trips', '42803', 'column "trips.pier" must appear in the GROUP BY clause or be used in an aggregate function', 'pier'],
    ['SELECT count(*) FROM trips WHERE', '42601', 'syntax error at end of input', ''],
    ["SELECT count(*) FROM trips WHERE pier = 'p1", '42601', `unterminated quoted string at or near "'p1"`, "'p1"],
    ['SELECT count(*) FROM trips WHERE secret_note = 1', '42703', 'column "secret_note" does not exist', 'secret_note'],
  ]
  test.each(cases)('%s', async (text, code, message, at) => {
    const refused = await refusal(text)
    expect(refused).toMatchObject({ code, message })
    expect(refused.position).toBe(String(at === '' ? text.length + 1 : text.lastIndexOf(at) + 1))
  })
})

describe('hostile spellings of a private name are the name, or are refused; none reaches rows', () => {
  const same = [
    'trips',
    '"trips"',
    'TrIpS',
    'public.trips',
    'ferries.public.trips',
    '"public"."trips"',
    'trips/**/',
    '/* -- */ trips',
    'trips -- riders\n',
    'public . trips',
    'ONLY trips',
    'trips *',
    'trips AS "riders"',
    '(SELECT fare FROM trips) AS t',
    'trips t CROSS JOIN (VALUES (1)) v(x)',
  ]
  test.each(same)('count(*) over %s', async (spelling) => {
    expect(await value(`SELECT count(*) FROM ${spelling}`)).toBe('3000')
  })
  test.each(['U&"trips"', 'U&"\\0074rips"', 'U&"!0074rips" UESCAPE \'!\'', '"public".U&"tr\\0069ps"'])(
    '%s is the name in Unicode escapes',
    async (spelling) => {
      const answer = await client.query(`SELECT count(*) FROM ${spelling}`).then(
        ({ rows }) => rows[0] as unknown,
        (problem: pg.DatabaseError) => problem.code,
      )
      expect([{ count: '3000' }, '42501']).toContainEqual(answer)
      const rows = await refusal(`SELECT * FROM ${spelling}`)
      expect(rows.code).toBe('42501')
    },
  )
  test('a name in other letters is another name', async () => {
    expect(await refusal('SELECT count(*) FROM "Trips"')).toMatchObject({ code: '42P01', message: 'relation "Trips" does not exist' })
    expect(await refusal('SELECT count(*) FROM other.trips')).toMatchObject({ code: '42P01' })
    expect(await refusal('SELECT count(*) FROM elsewhere.public.trips')).toMatchObject({ code: '0A000' })
  })
  test('a name inside a literal, a comment or a dollar quote is text', async () => {
    expect(await value("SELECT 'trips'")).toBe('trips')
    expect(await value('SELECT $$FROM trips$$')).toBe('FROM trips')
    expect(await value('SELECT 1 /* FROM trips /* riders */ */')).toBe('1')
    expect(await value('SELECT count(*) FROM riders WHERE district <> $q$ FROM trips; DROP TABLE riders; -- $q$')).toBe('300')
    expect(await value("SELECT length(U&'\\0074rips trips')")).toBe('11')
    expect(await value('SELECT 1 AS trips')).toBe('1')
  })
})

test('ways around the gate raise 42501 and give no row', async () => {
  const ways = [
    "DO $$ BEGIN EXECUTE 'SELECT * FROM tri' || 'ps'; END $$",
    "DO $$ DECLARE r record; BEGIN FOR r IN EXECUTE 'SELECT * FROM tri' || 'ps' LOOP RAISE NOTICE '%', r; END LOOP; END $$",
    'EXPLAIN ANALYZE SELECT * FROM U&"trip\\0073"',
    'TABLE trips',
    'COPY trips TO STDOUT',
    'COPY (TABLE trips) TO STDOUT',
    'LOCK TABLE trips',
    'SELECT ctid FROM trips',
    'SELECT trips FROM trips',
    'SELECT row_to_json(t) FROM trips t',
    'SELECT rider_id, count(*) FROM trips GROUP BY rider_id',
    'SELECT array_agg(fare) FROM trips',
    'SELECT string_agg(pier, $$,$$) FROM trips',
    'SELECT fare, sum(fare) OVER () FROM trips',
    'SELECT count(*) FROM trips a, trips b WHERE a.fare = b.fare',
    'MERGE INTO piers USING trips ON false WHEN NOT MATCHED THEN DO NOTHING',
    'INSERT INTO trips DEFAULT VALUES',
    'UPDATE trips SET fare = 1',
    'DELETE FROM riders',
    'TRUNCATE trips',
    "SELECT pg_read_file('/etc/passwd') FROM trips",
    "SELECT query_to_xml('SELECT * FROM tri' || 'ps', true, true, '')",
    'CREATE FUNCTION pg_temp.f() RETURNS bigint LANGUAGE sql AS $$ SELECT count(*) FROM trips $$',
  ]
  for (const way of ways) expect([way, (await refusal(way)).code]).toEqual([way, '42501'])
  for (const way of ['SELECT * FROM trips FOR UPDATE', 'WITH gone AS (DELETE FROM trips RETURNING *) SELECT count(*) FROM gone'])
    expect(await refusal(way)).toMatchObject({ code: '42601', message: expect.stringContaining('[text.unreadable]') as string })
})

test('a table like a private one holds no rows, and may be made under another name', async () => {
  await client.query('CREATE TEMP TABLE mine (LIKE trips)')
  expect(await value('SELECT count(*) FROM mine')).toBe('0')
})

test('hedgerow.pull called by hand is answered as the statement would be, or says what it takes', async () => {
  expect(await value("SELECT hedgerow.pull('SELECT count(*) FROM riders', '[]')->0")).toBe('{"count": "300"}')
  expect((await refusal("SELECT hedgerow.pull('SELECT district, rider_id FROM riders', '[]')")).code).toMatch(/^42(501|803)$/)
  expect((await refusal("SELECT hedgerow.pull('SELECT count(*) FROM riders; SELECT 1', '[]')")).code).toBe('42501')
  for (const call of [
    "NULL, NULL, '[1,2]'",
    "'SELECT count(*) FROM riders', '{}'",
    "'SELECT count(*) FROM riders', '[[[1]]]'",
    "'SELECT count(*) FROM riders', '[]', '{}'",
  ]) {
    expect([call, (await refusal(`SELECT hedgerow.pull(${call})`)).code]).toEqual([call, '22023'])
  }
  const explained = await refusal("SELECT hedgerow.explain('SELECT 1')")
  expect([explained.code, explained.hint]).toEqual(['42501', expect.stringMatching(/SELECT .* FROM \w+/)])
})

test('a temporary table named like a private one cannot be made', async () => {
  for (const text of [
    'CREATE TEMP TABLE trips (x int)',
    'CREATE TEMP TABLE trips AS SELECT 1',
    'SELECT 1 AS x INTO TEMP trips',
    'CREATE TEMP VIEW riders AS SELECT 1',
    'CREATE TEMP TABLE pg_temp.trips (x int)',
  ]) {
    expect([text, (await refusal(text)).message]).toEqual([
      text,
      expect.stringMatching(/^the name "(trips|riders)" belongs to a private table \[rows\.shadow\]$/),
    ])
  }
})

test('where one was made behind the gate’s back it is not mistaken for the private one', async () => {
  const each = await server.connect('ana')
  await each.query("DO $$ BEGIN EXECUTE 'CREATE TEMP TABLE tri' || 'ps (fare int)'; END $$")
  await expect(each.query('SELECT count(*) FROM trips')).rejects.toMatchObject({ code: '42501', message: expect.stringContaining('[names.hidden]') as string })
  expect((await each.query('SELECT count(*) FROM public.trips')).rows).toEqual([{ count: '3000' }])
})

describe('size and depth', () => {
  test('a statement of a megabyte over nothing private passes, over a private table it is refused', async () => {
    const long = 'x'.repeat(1_000_000)
    expect(await value(`SELECT length('${long}')`)).toBe('1000000')
    expect(await refusal(`SELECT count(*) FROM riders WHERE district <> '${long}'`)).toMatchObject({
      code: '54000',
      message: expect.stringContaining('[text.too-long]') as string,
    })
  })
  test('10,000 nested parentheses are refused over a private table, and PostgreSQL’s to judge over none', async () => {
    const nested = `${'('.repeat(10_000)}1${')'.repeat(10_000)}`
    expect(await refusal(`SELECT count(*) FROM riders WHERE ${nested} = 1`)).toMatchObject({ code: '54001' })
    const free = await client.query(`SELECT ${nested} AS one`).then(
      ({ rows }) => rows[0] as unknown,
      (problem: pg.DatabaseError) => problem.code,
    )
    expect([{ one: '1' }, '54001', '42601']).toContainEqual(free)
    const chain = `SELECT count(*) FROM riders WHERE ${Array.from({ length: 3_000 }, (_, i) => `birth_year <> ${i.toString()}`).join(' AND ')}`
    const answer = await client.query(chain).then(
      ({ rows }) => rows[0] as unknown,
      (problem: pg.DatabaseError) => problem.code,
    )
    expect([{ count: '0' }, '54000', '54001']).toContainEqual(answer)
  })
  test('more blocks or more aggregates than are answered at once are refused before anything is debited, and soon', async () => {
    const many = (count: number, each: (i: number) => string): string => Array.from({ length: count }, (_, i) => each(i)).join(', ')
    const start = Date.now()
    expect(await refusal(`SELECT ${many(101, (i) => `(SELECT count(*) FROM riders WHERE birth_year = ${i.toString()})`)}`)).toMatchObject({
      code: '54000',
      message: expect.stringContaining('[block.too-many]') as string,
    })
    expect(await refusal(`SELECT ${many(1500, (i) => `sum(fare + ${i.toString()})`)} FROM trips`)).toMatchObject({
      code: '54000',
      message: expect.stringContaining('[block.too-many]') as string,
    })
    expect(Date.now() - start).toBeLessThan(10_000)
    expect(
      Object.keys((await client.query(`SELECT ${many(200, (i) => `sum(fare + ${i.toString()}) AS c${i.toString()}`)} FROM trips`)).rows[0] as object),
    ).toHaveLength(200)
  })
  test('1,664 columns are answered or refused, 1,665 are PostgreSQL’s own complaint', async () => {
    const list = (count: number): string => Array.from({ length: count }, (_, i) => `count(*) + ${i.toString()} AS c${i.toString()}`).join(', ')
    expect(Object.keys((await client.query(`SELECT ${list(1664)} FROM riders`)).rows[0] as object)).toHaveLength(1664)
    expect(await refusal(`SELECT ${list(1665)} FROM riders`)).toMatchObject({ code: '54011' })
  }, 60_000)
})

describe('bytes', () => {
  test('random bytes, HTTP, a short and a huge start-up packet end that connection and no other', async () => {
    const openings = [
      Buffer.from('GET / HTTP/1.1\r\nHost: x\r\n\r\n'),
      Buffer.from(Array.from({ length: 64 }, (_, i) => (i * 151 + 7) % 256)),
      Buffer.concat([int32(4), int32(0)]),
      Buffer.concat([int32(0x7fff_ffff), int32(196_608)]),
      Buffer.concat([int32(9), int32(196_608), Buffer.from('u')]),
      startupPacket({ user: 'ana', database: server.dataSet }, 0x0002_0000),
    ]
    for (const bytes of openings) {
      const each = await RawClient.open(server.hedgerow.port)
      each.send(bytes)
      each.socket.end()
      await each.until('never', 8_000)
      expect(each.closed).toBe(true)
    }
    await stillServes()
  })
  test('a wrong password, an unknown user and an unknown database look alike', async () => {
    const told = async (user: string, database: string): Promise<string> => {
      const each = await RawClient.open(server.hedgerow.port)
      const received = await each.logIn(user, database, 'sextant')
      const error = fields(received.findLast((one) => one.type === 'E'))
      return `${received.map((one) => one.type).join('')} ${error['C'] ?? ''} ${(error['M'] ?? '').replace(user, 'NAME')}`
    }
    const wrong = await told('ana', server.dataSet)
    expect(wrong).toContain('28P01 password authentication failed for user "NAME"')
    expect(await told('nobody', server.dataSet)).toBe(wrong)
    expect(await told('ana', 'hedgerow_ledger')).toBe(wrong)
    expect(await told('ana', 'people_vault')).toBe(wrong)
    expect(await told('postgres', server.dataSet)).toBe(wrong)
  })
  test('invalid UTF-8 in a Query is PostgreSQL’s complaint, with and without a private name', async () => {
    const each = await raw()
    for (const text of ["SELECT '\xff\xfe'", "SELECT count(*) FROM riders WHERE district = '\xff'"]) {
      each.send(frame('Q', Buffer.from(`${text}\0`, 'latin1')))
      expect(fields((await each.until('Z')).find((one) => one.type === 'E'))).toMatchObject({ C: '22021' })
    }
    each.send(query('SELECT count(*) FROM riders'))
    expect((await each.until('Z')).some((one) => one.type === 'D')).toBe(true)
  })
  test('NUL in a text, in a Query and in a parameter, is refused', async () => {
    const each = await raw()
    each.send(frame('Q', Buffer.from("SELECT count(*) FROM riders WHERE district = 'a\0b'\0")))
    const received = await each.until('Z', 4_000).catch(() => [])
    expect(received.some((one) => one.type === 'D')).toBe(false)
    const other = await raw()
    other.send(extended('SELECT count(*) FROM riders WHERE district = $1', ['a\0b']), sync)
    expect(fields((await other.until('Z')).find((one) => one.type === 'E'))['C']).toBe('22021')
    await stillServes()
  })
  test('an oversized frame, an unknown type and a frame that breaks off end that session with a clear word', async () => {
    const huge = await raw()
    huge.send(Buffer.from('Q'), int32(0x7000_0000))
    expect(fields((await huge.until('never')).find((one) => one.type === 'E'))).toMatchObject({ S: 'FATAL', C: '54000' })
    const unknown = await raw()
    unknown.send(frame('!', Buffer.from('x')))
    expect(fields((await unknown.until('never')).find((one) => one.type === 'E'))).toMatchObject({ S: 'FATAL', C: '08P01' })
    const broken = await raw()
    broken.send(Buffer.from('Q'), int32(100), Buffer.from('SELECT count(*) FROM'))
    broken.socket.end()
    await broken.until('never')
    await stillServes()
  })
})

describe('session settings that change how a text is read', () => {
  test('standard_conforming_strings = off: a backslash neither hides nor makes up a literal', async () => {
    const each = await server.connect('ana')
    await each.query('SET standard_conforming_strings = off; SET escape_string_warning = off; SET backslash_quote = on')
    const direct = await server.vault()
    await direct.query('SET standard_conforming_strings = off; SET escape_string_warning = off; SET backslash_quote = on')
    for (const text of [
      "SELECT count(*) FROM trips WHERE pier = 'p\\061'",
      "SELECT count(*) FROM trips WHERE pier <> 'it\\'s'",
      "SELECT count(*) FROM trips WHERE pier <> '\\\\'",
      "SELECT count(*) FROM trips WHERE pier = E'p\\x31'",
      "SELECT count(*) FROM trips WHERE pier = 'p1'",
      "SELECT count(*) || '\\\\' AS n FROM trips",
    ]) {
      const wanted = (await direct.query(text)).rows as unknown
      const got = await each.query(text).then(
        ({ rows }) => rows as unknown,
        (problem: pg.DatabaseError) => problem.code,
      )
      expect([text, got]).toEqual([
        text,
        expect.toSatisfy((one: unknown) => one === '42601' || one === '42501' || JSON.stringify(one) === JSON.stringify(wanted)),
      ])
    }
    expect((await each.query("SELECT count(*) FROM trips WHERE pier = 'p1'")).rows).toEqual([{ count: '750' }])
  })
  test('client_encoding LATIN1 with letters beyond ASCII', async () => {
    const each = await raw()
    each.send(query("SET client_encoding = 'LATIN1'"))
    await each.until('Z')
    each.send(frame('Q', Buffer.from("SELECT 'Fähre' AS \"Fähre\", count(*) FROM riders WHERE district <> 'Süd'\0", 'latin1')))
    const received = await each.until('Z')
    expect(received.find((one) => one.type === 'D')?.body.toString('latin1')).toContain('Fähre')
    expect(received.find((one) => one.type === 'T')?.body.toString('latin1')).toContain('Fähre')
    each.send(frame('Q', Buffer.from("SELECT 'ä', fare FROM trips\0", 'latin1')))
    expect(fields((await each.until('Z')).find((one) => one.type === 'E'))).toMatchObject({ C: '42501', P: '23' })
  })
  test('a search_path, a row_security and a role of the analyst’s own change nothing', async () => {
    const each = await server.connect('ana')
    await each.query("SET search_path = pg_temp, public; SET TimeZone = 'Asia/Kolkata'")
    expect((await each.query('SELECT count(*) FROM trips')).rows).toEqual([{ count: '3000' }])
    await each.query('SET row_security = on')
    await expect(each.query('DO $$ BEGIN EXECUTE $q$ SELECT count(*) FROM tri$q$ || $q$ps$q$; END $$')).rejects.toMatchObject({ code: '42501' })
    await expect(each.query('SET ROLE hedgerow_owner')).rejects.toMatchObject({ code: '42501' })
    await expect(each.query('SET SESSION AUTHORIZATION postgres')).rejects.toMatchObject({ code: '42501' })
  })
})
