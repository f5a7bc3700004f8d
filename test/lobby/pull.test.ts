import { performance } from 'node:perf_hooks'
import type pg from 'pg'
import { afterAll, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import type { PullReply } from '../../src/answer/ports.ts'
import { failureOf, ferryLobby, type FerryLobby } from './ferry-lobby.ts'

let lobby: FerryLobby
let ana: pg.Client

beforeAll(async () => {
  lobby = await ferryLobby()
  await lobby.install()
})
afterAll(() => lobby.stop())
beforeEach(async () => {
  ana = await lobby.analyst('ana')
  lobby.pull.requests.length = 0
  lobby.pull.answerWith(async () => rows([{ c1: '7' }]))
})

function rows(list: readonly Readonly<Record<string, string | boolean | null>>[], notice = ''): PullReply {
  return { kind: 'rows', rows: list, notice }
}

const block = `FROM jsonb_to_recordset(hedgerow.pull('SELECT count(*) FROM trips', jsonb_build_array($1::int8, true, NULL, 1e400::numeric, 'é"\\')))`

describe('a pull', () => {
  test('carries who asks, what, with which arguments and under which settings', async () => {
    await ana.query("SET hedgerow.epsilon = '0.25'; SET hedgerow.margin = '5%'; SET TimeZone = 'Asia/Kathmandu'; SET application_name = 'ledger of the pier'")
    const pid = (await ana.query('SELECT pg_backend_pid() AS pid')).rows[0].pid
    const answer = await ana.query(`SELECT c1 ${block} AS r(c1 int8)`, ['9223372036854775807'])
    expect(answer.rows).toEqual([{ c1: '7' }])
    const [request] = lobby.pull.requests
    expect(request).toMatchObject({
      kind: 'release',
      pid,
      user: 'ana',
      database: 'ferries',
      text: 'SELECT count(*) FROM trips',
      args: ['9223372036854775807', 'true', null, `1${'0'.repeat(400)}`, 'é"\\'],
      siblings: [],
      timeZone: 'Asia/Kathmandu',
      application: 'ledger of the pier',
    })
    expect(request?.settings).toEqual({ epsilon: '0.25', margin: '5%', delta: '1e-8', confidence: '0.95', noise: 'auto', replay: 'off', nonnegative: 'off' })
    expect(request?.now).toMatch(/^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?\+05:45$/)
    expect(Date.parse(request?.statement ?? '')).not.toBeNaN()
  })

  test("raises the reply's notice, and its errors with SQLSTATE, message and hint", async () => {
    const notices: (string | undefined)[] = []
    ana.on('notice', (notice) => notices.push(notice.message))
    lobby.pull.answerWith(async () => rows([], 'spent 100% of % nothing'))
    await ana.query("SELECT hedgerow.pull('x', '[]')")
    expect(notices).toEqual(['spent 100% of % nothing'])
    lobby.pull.answerWith(async () => ({ kind: 'error', sqlstate: '42803', message: 'no % aggregate', hint: 'SELECT count(*) FROM trips' }))
    await expect(ana.query("SELECT hedgerow.pull('x', '[]')")).rejects.toMatchObject({
      code: '42803',
      message: 'no % aggregate',
      hint: 'SELECT count(*) FROM trips',
    })
    lobby.pull.answerWith(async () => ({ kind: 'error', sqlstate: '22023', message: 'bad', hint: '' }))
    await expect(ana.query("SELECT hedgerow.pull('x', '[]')")).rejects.toMatchObject({ code: '22023', hint: undefined })
  })

  test('happens for no EXPLAIN, LIMIT 0, WHERE false, untaken CASE or WITH NO DATA', async () => {
    const from = "FROM jsonb_to_recordset(hedgerow.pull('x', '[]')) AS r(c1 int8)"
    await ana.query(`EXPLAIN SELECT * ${from}`)
    await ana.query(`SELECT * ${from} LIMIT 0`)
    await ana.query(`SELECT * ${from} WHERE false`)
    await ana.query(`SELECT CASE WHEN random() > 2 THEN (SELECT c1 ${from}) END`)
    await ana.query(`CREATE TEMP TABLE none AS SELECT * ${from} WITH NO DATA`)
    expect(lobby.pull.requests).toEqual([])
  })

  test('happens once for a CTE used twice and for a join that scans it again, and at each reading of a temporary view', async () => {
    const from = "FROM jsonb_to_recordset(hedgerow.pull('x', '[]')) AS r(c1 int8)"
    await ana.query(`WITH a AS (SELECT * ${from}) SELECT * FROM a, a AS b`)
    await ana.query(`SELECT * FROM generate_series(1, 50) LEFT JOIN (SELECT * ${from}) AS a ON true`)
    expect(lobby.pull.requests.length).toBe(2)
    await ana.query(`CREATE TEMP VIEW counted AS SELECT c1 ${from}`)
    for (const value of ['1', '2']) {
      lobby.pull.answerWith(async () => rows([{ c1: value }]))
      expect((await ana.query('SELECT * FROM counted')).rows).toEqual([{ c1: value }])
    }
  })

  test('two cursors open at once keep their own answers', async () => {
    lobby.pull.answerWith(async (request) => rows([1, 2, 3].map((each) => ({ c1: `${request.text}${each}` }))))
    const cursor = (name: string): string => `DECLARE ${name} CURSOR FOR SELECT c1 FROM jsonb_to_recordset(hedgerow.pull('${name}', '[]')) AS r(c1 text)`
    await ana.query('BEGIN')
    await ana.query(cursor('a'))
    await ana.query(cursor('b'))
    const seen: string[] = []
    for (const name of ['a', 'b', 'a', 'b']) seen.push((await ana.query(`FETCH 1 FROM ${name}`)).rows[0].c1)
    await ana.query('COMMIT')
    expect(seen).toEqual(['a1', 'b1', 'a2', 'b2'])
  })

  test('works in a read-only transaction, with a hostile search path and look-alikes in pg_temp', async () => {
    await ana.query('CREATE TEMP TABLE pg_class (relname text); CREATE TYPE pg_temp.jsonb AS (a int)')
    await ana.query('SET search_path = pg_temp, public, pg_catalog; SET standard_conforming_strings = off; SET transform_null_equals = on')
    await ana.query('BEGIN READ ONLY')
    expect((await ana.query("SELECT hedgerow.pull('x', '[]')::text AS answer")).rows).toEqual([{ answer: '[{"c1": "7"}]' }])
    await ana.query('ROLLBACK')
  })

  test('is refused where a temporary relation hides a private table', async () => {
    await ana.query('CREATE TEMP TABLE trips (x int)')
    const text = "SELECT hedgerow.pull('x', '[]', '[]', '{riders,trips}')"
    await expect(ana.query(text)).rejects.toMatchObject({ code: '42501', message: expect.stringContaining('[names.hidden]') })
    expect(lobby.pull.requests).toEqual([])
    await ana.query('DROP TABLE trips')
    expect(await failureOf(ana, text)).toBe('no error')
  })
})

describe('an interrupted pull', () => {
  const never = (): Promise<PullReply> => new Promise(() => undefined)

  test('ends at once in 57014 on statement_timeout, hangs up, and the session goes on', async () => {
    lobby.pull.answerWith(never)
    const before = lobby.pull.aborted()
    await ana.query('SET statement_timeout = 150')
    const start = performance.now()
    expect(await failureOf(ana, "SELECT hedgerow.pull('x', '[]')")).toBe('57014')
    expect(performance.now() - start).toBeLessThan(600)
    await expect.poll(() => lobby.pull.aborted()).toBe(before + 1)
    lobby.pull.answerWith(async () => rows([{ c1: '7' }]))
    await ana.query('SET statement_timeout = 0')
    expect(await failureOf(ana, "SELECT hedgerow.pull('x', '[]')")).toBe('no error')
  })

  test('ends at once in 57014 on a cancel', async () => {
    lobby.pull.answerWith(never)
    const admin = await lobby.admin('ferries')
    const pid = (await ana.query('SELECT pg_backend_pid() AS pid')).rows[0].pid
    const failing = failureOf(ana, "SELECT hedgerow.pull('x', '[]')").then((code) => ({ code, at: performance.now() }))
    await expect.poll(() => lobby.pull.requests.length).toBe(1)
    const start = performance.now()
    await admin.query('SELECT pg_cancel_backend($1)', [pid])
    const { code, at } = await failing
    expect(code).toBe('57014')
    expect(at - start).toBeLessThan(400)
  })

  test('is hung up when the client goes away', async () => {
    lobby.pull.answerWith(never)
    const before = lobby.pull.aborted()
    void ana.query("SELECT hedgerow.pull('x', '[]')").catch(() => undefined)
    await expect.poll(() => lobby.pull.requests.length).toBe(1)
    ;(ana as unknown as { connection: { stream: { destroy(): void } } }).connection.stream.destroy()
    await expect.poll(() => lobby.pull.aborted(), { timeout: 3000 }).toBe(before + 1)
  })

  test('opens a new line after Hedgerow was restarted, and says so where it cannot be reached', async () => {
    await ana.query("SELECT hedgerow.pull('x', '[]')")
    lobby.pull.dropSessions()
    expect(await failureOf(ana, "SELECT hedgerow.pull('x', '[]')")).toBe('no error')
    lobby.pull.answerWith(async () => {
      lobby.pull.dropSessions()
      return rows([])
    })
    const lost = ana.query("SELECT hedgerow.pull('x', '[]')")
    await expect(lost).rejects.toMatchObject({ code: '58000', message: expect.stringContaining('[pull.unreachable]') })
    await expect(lost).rejects.not.toMatchObject({ detail: expect.anything() })
  })
})

describe('released rows', () => {
  test('come back exactly, whatever their type', async () => {
    const values: readonly (readonly [string, readonly (string | boolean | null)[]])[] = [
      ['int8', ['9223372036854775807', '-9223372036854775808', null]],
      ['numeric', ['0.1000', '123456789012345678901234567890.123456789', 'NaN', 'Infinity', `1${'0'.repeat(300)}`]],
      ['numeric(10,2)', ['12.50']],
      ['float8', ['0.30000000000000004', 'NaN', '-Infinity', '5e-324']],
      ['float4', ['0.1', '3.4028235e+38']],
      ['timestamptz', ['2025-06-01 12:00:00.123456+00', 'infinity', '0044-03-15 11:00:00+00 BC']],
      ['date', ['2025-06-01', '-infinity']],
      ['interval', ['1 year 2 mons -3 days +04:05:06.789']],
      ['text', ['', 'tab\t new\n return\r quote\' double" back\\slash \u0001\u007f é 😀 \u2028 {"a":[1]} NULL null', ' ']],
      ['bytea', ['\\x', '\\x00ff5c27']],
      ['bool', [true, false, 't', null]],
      ['uuid', ['a0eebc99-9c0b-4ef8-bb6d-6bb9bd380a11']],
      ['public.mood', ['calm', 'cross']],
    ]
    await ana.query("SET TimeZone = 'UTC'; SET IntervalStyle = 'postgres'")
    for (const [type, list] of values) {
      lobby.pull.answerWith(async () => rows(list.map((c1) => ({ c1 }))))
      const texts = (
        await ana.query({ text: `SELECT c1::text FROM jsonb_to_recordset(hedgerow.pull('x', '[]')) AS r(c1 ${type})`, rowMode: 'array' })
      ).rows.map((row: unknown[]) => row[0])
      const expected = list.map((value) => (value === true || value === 't' ? 'true' : value === false ? 'false' : value))
      expect({ type, texts }).toEqual({ type, texts: expected })
    }
  })

  test('100,000 of them arrive in a few seconds', async () => {
    const many = Array.from({ length: 100_000 }, (_, at) => ({ c1: String(at), c2: `pier ${at}`, c3: '12.50' }))
    lobby.pull.answerWith(async () => rows(many))
    const start = performance.now()
    const answer = await ana.query(
      "SELECT count(*)::int AS n, sum(c1)::text AS total, sum(c3)::text AS fares FROM jsonb_to_recordset(hedgerow.pull('x', '[]')) AS r(c1 int8, c2 text, c3 numeric)",
    )
    expect(answer.rows).toEqual([{ n: 100_000, total: '4999950000', fares: '1250000.00' }])
    const elapsed = performance.now() - start
    console.info(`100,000 rows through a pull: ${Math.round(elapsed)} ms`)
    expect(elapsed).toBeLessThan(8000)
  })
})

describe('what an analyst can look up', () => {
  test('is typed, and asked for under the own name', async () => {
    lobby.pull.answerWith(async (request) => {
      switch (request.kind) {
        case 'budget':
          return rows([
            { c1: request.user, c2: 'always', c3: '4', c4: '0.000001', c5: null, c6: '0.1', c7: '0.01', c8: '0', c9: '40', c10: '0.3', c11: 'a note' },
          ])
        case 'charges':
          return rows([{ c1: '2026-12-01T10:00:00Z', c2: null, c3: '0.005', c4: '0', c5: 'gaussian', c6: 'public.trips', c7: 'psql', c8: '1' }])
        case 'last_answer':
          return rows([
            {
              c1: 'count',
              c2: 'laplace',
              c3: '200',
              c4: '600',
              c5: '0.95',
              c6: '12',
              c7: '20',
              c8: '0.1',
              c9: '0.005',
              c10: '0',
              c11: '2026-12-01T10:00:00Z',
              c12: '1',
            },
          ])
        case 'bounds':
          return rows([{ c1: 'public.trips', c2: 'fare_pence', c3: 'clamp 0 to 2500', c4: '12', c5: '20', c6: '0', c7: '2500', c8: '1', c9: null }])
        default:
          return rows([{ c1: 'one line' }, { c1: 'another' }])
      }
    })
    expect((await ana.query('SELECT account, epsilon_cap, epsilon_spent, default_statements_left, note FROM hedgerow.budget')).rows).toEqual([
      { account: 'ana', epsilon_cap: '4', epsilon_spent: null, default_statements_left: '40', note: 'a note' },
    ])
    expect((await ana.query('SELECT at, rho, mechanism, id FROM hedgerow.charges')).rows).toEqual([
      { at: new Date('2026-12-01T10:00:00Z'), rho: '0.005', mechanism: 'gaussian', id: '1' },
    ])
    expect((await ana.query('SELECT output, margin, rows_per_group FROM hedgerow.last_answer')).rows).toEqual([
      { output: 'count', margin: '600', rows_per_group: '20' },
    ])
    expect((await ana.query('SELECT table_name, groups, rows, clamp_high FROM hedgerow.bounds')).rows).toEqual([
      { table_name: 'public.trips', groups: '12', rows: '20', clamp_high: '2500' },
    ])
    expect((await ana.query("SELECT * FROM hedgerow.explain('SELECT count(*) FROM trips')")).rows).toEqual([{ explain: 'one line' }, { explain: 'another' }])
    expect(lobby.pull.requests.map((request) => [request.kind, request.user, request.text])).toEqual([
      ['budget', 'ana', ''],
      ['charges', 'ana', ''],
      ['last_answer', 'ana', ''],
      ['bounds', 'ana', ''],
      ['explain', 'ana', 'SELECT count(*) FROM trips'],
    ])
  })

  test('shows a cheap function of the own session nothing of other analysts', async () => {
    // The stand-in errs on purpose: it hands out bo's row as well where it is not asked in ana's name.
    lobby.pull.answerWith(async (request) => rows(request.user === 'ana' ? [{ c1: 'ana' }] : [{ c1: 'ana' }, { c1: 'bo' }]))
    await ana.query(`CREATE FUNCTION pg_temp.peek(who text) RETURNS boolean LANGUAGE plpgsql COST 0.0000001 AS
      $$ BEGIN RAISE NOTICE 'peeked %', who; RETURN true; END $$`)
    const seen: (string | undefined)[] = []
    ana.on('notice', (notice) => seen.push(notice.message))
    await ana.query("SELECT * FROM hedgerow.budget WHERE pg_temp.peek(account) AND account <> 'bo'")
    expect(seen).toEqual(['peeked ana'])
    const barrier = await (
      await lobby.admin('ferries')
    ).query(
      "SELECT c.relname FROM pg_class c WHERE c.relnamespace = 'hedgerow'::regnamespace AND c.relkind = 'v' AND NOT c.reloptions @> '{security_barrier=true}'",
    )
    expect(barrier.rows).toEqual([])
    const pinned = await (
      await lobby.admin('ferries')
    ).query(
      "SELECT proname FROM pg_proc WHERE pronamespace = 'hedgerow'::regnamespace AND (NOT prosecdef OR proowner <> 'hedgerow_owner'::regrole OR NOT proconfig @> '{\"search_path=pg_catalog, pg_temp\"}')",
    )
    expect(pinned.rows).toEqual([])
  })

  test('knows four kinds and no other', async () => {
    expect(await failureOf(ana, "SELECT hedgerow.read('release')")).toBe('22023')
    expect(await failureOf(ana, 'SELECT hedgerow.read(NULL)')).toBe('22023')
  })
})
