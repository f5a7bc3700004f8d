import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { AnswerPull, PullReply, PullRequest } from '../../src/answer/ports.ts'
import { pullCeilings, servePulls, type PullPort, type PullPortOptions } from '../../src/wire/pull-port.ts'
import { testServer, type TestServer } from '../harness/server.ts'
import { fields, query, RawClient } from './raw-client.ts'

const request: PullRequest = {
  kind: 'release',
  pid: 7,
  user: 'ana',
  database: 'ferries',
  text: "SELECT count(*) FROM trips WHERE pier = 'pö\"l'",
  args: ['12345678901234567890.5', null, true],
  siblings: [],
  settings: { epsilon: '0.2' },
  timeZone: 'UTC',
  now: '2026-05-04T12:00:00Z',
  statement: '2026-05-04T12:00:00Z',
  application: '',
}

interface Asked {
  readonly request: PullRequest
  readonly signal: AbortSignal
}

let server: TestServer
let database: string
let port: PullPort
let besideUs = true
const asked: Asked[] = []
const events: string[] = []

const answer: AnswerPull = async (request, signal) => {
  asked.push({ request, signal })
  if (request.text === 'throw') throw new Error('a text that must not get out')
  if (request.text === 'wait') await new Promise<void>((resolve) => signal.addEventListener('abort', () => resolve()))
  if (request.text === 'refuse') return { kind: 'error', sqlstate: '42501', message: 'the budget is spent', hint: 'wait' }
  if (request.text === 'many') return { kind: 'rows', rows: Array.from({ length: 20_000 }, (_, index) => ({ c1: `pier ${index}`, c2: null })), notice: '' }
  return { kind: 'rows', rows: [{ c1: '42', c2: request.args[0] ?? null }], notice: 'spent 0.1' }
}

function options(over: Partial<PullPortOptions> = {}): PullPortOptions {
  return { port: 0, user: 'hedgerow', password: 'quay', answer, log: (_, event) => events.push(event), ceilings: pullCeilings, loginTimeoutMs: 5_000, ...over }
}

beforeAll(async () => {
  server = await testServer()
  database = await server.createDatabase('pulls')
  besideUs = (process.env['HEDGEROW_TEST_IMAGE'] ?? '') === '' && ['127.0.0.1', 'localhost'].includes(server.host)
  port = await servePulls(options())
  await direct('CREATE EXTENSION dblink')
})
afterAll(async () => {
  await port.close()
  await server.stop()
})

async function direct(sql: string, values: readonly unknown[] = []): Promise<pg.QueryResult> {
  const client = await superuser()
  try {
    return await client.query(sql, [...values])
  } finally {
    await client.end()
  }
}

async function superuser(): Promise<pg.Client> {
  const client = new pg.Client({ connectionString: database })
  client.on('error', () => undefined)
  await client.connect()
  return client
}

const target = (over = '') => `host=127.0.0.1 port=${port.port} user=hedgerow dbname=pull password=quay ${over}`
const pull = (over: Partial<PullRequest> = {}) => `pull ${JSON.stringify({ ...request, ...over })}`
const replyOf = (result: pg.QueryResult) => JSON.parse(result.rows[0].reply as string) as PullReply

describe('dblink of a real lobby', () => {
  test('is answered, with every character and digit as it was sent', async ({ skip }) => {
    skip(!besideUs, 'this server cannot reach us on the loopback')
    const result = await direct('SELECT reply FROM dblink($1, $2) AS r(reply text)', [target(), pull()])
    expect(replyOf(result)).toEqual({ kind: 'rows', rows: [{ c1: '42', c2: '12345678901234567890.5' }], notice: 'spent 0.1' })
    expect(asked.at(-1)?.request).toEqual(request)
  })

  test('keeps a connection for several pulls, asynchronous ones too, and gets long replies whole', async ({ skip }) => {
    skip(!besideUs, 'this server cannot reach us on the loopback')
    const client = await superuser()
    await client.query("SELECT dblink_connect('p', $1)", [target()])
    expect(replyOf(await client.query("SELECT reply FROM dblink('p', $1) AS r(reply text)", [pull({ text: 'many' })]))).toMatchObject({ kind: 'rows' })
    await client.query("SELECT dblink_send_query('p', $1)", [pull({ text: 'refuse' })])
    const result = await client.query("SELECT reply FROM dblink_get_result('p') AS r(reply text)")
    expect(replyOf(result)).toEqual({ kind: 'error', sqlstate: '42501', message: 'the budget is spent', hint: 'wait' })
    await client.query("SELECT dblink_disconnect('p')")
    await client.end()
  })

  test('a cancelled query of the lobby aborts the answer', async ({ skip }) => {
    skip(!besideUs, 'this server cannot reach us on the loopback')
    const client = await superuser()
    const pid = (await client.query('SELECT pg_backend_pid() AS pid')).rows[0].pid
    await client.query("SELECT dblink_connect('p', $1)", [target()])
    const before = asked.length
    const running = client
      .query(`
      DO $$ BEGIN
        PERFORM public.dblink_send_query('p', '${pull({ text: 'wait' }).replaceAll("'", "''")}');
        WHILE public.dblink_is_busy('p') = 1 LOOP PERFORM pg_sleep(0.005); END LOOP;
      EXCEPTION WHEN query_canceled THEN PERFORM public.dblink_disconnect('p'); RAISE;
      END $$`)
      .then(
        () => 'done',
        (error: { readonly code?: string }) => error.code,
      )
    await expect.poll(() => asked.length).toBe(before + 1)
    expect(asked.at(-1)!.signal.aborted).toBe(false)
    await direct('SELECT pg_cancel_backend($1)', [pid])
    expect(await running).toBe('57014')
    await expect.poll(() => asked.at(-1)!.signal.aborted).toBe(true)
    await client.end()
  })

  test("dblink_cancel_query reaches the answer by the connection's key", async ({ skip }) => {
    skip(!besideUs, 'this server cannot reach us on the loopback')
    const client = await superuser()
    await client.query("SELECT dblink_connect('p', $1)", [target()])
    const before = asked.length
    await client.query("SELECT dblink_send_query('p', $1)", [pull({ text: 'wait' })])
    await expect.poll(() => asked.length).toBe(before + 1)
    await client.query("SELECT dblink_cancel_query('p')")
    await expect(client.query("SELECT * FROM dblink_get_result('p') AS r(reply text)")).rejects.toMatchObject({ code: '57014' })
    expect(asked.at(-1)!.signal.aborted).toBe(true)
    await client.end()
  })

  test('a backend that is terminated aborts the answer', async ({ skip }) => {
    skip(!besideUs, 'this server cannot reach us on the loopback')
    const client = await superuser()
    const pid = (await client.query('SELECT pg_backend_pid() AS pid')).rows[0].pid
    await client.query("SELECT dblink_connect('p', $1)", [target()])
    const before = asked.length
    await client.query("SELECT dblink_send_query('p', $1)", [pull({ text: 'wait' })])
    await expect.poll(() => asked.length).toBe(before + 1)
    await direct('SELECT pg_terminate_backend($1)', [pid])
    await expect.poll(() => asked.at(-1)!.signal.aborted).toBe(true)
  })

  test('a wrong password, user or database is turned away alike', async ({ skip }) => {
    skip(!besideUs, 'this server cannot reach us on the loopback')
    for (const over of ['password=pier', 'user=ana', 'dbname=ferries']) {
      const failing = direct('SELECT * FROM dblink($1, $2) AS r(reply text)', [target(over), pull()])
      await expect(failing).rejects.toMatchObject({ code: '08001', detail: expect.stringMatching(/password authentication failed for user "(hedgerow|ana)"/) })
    }
    expect(events.filter((event) => event === 'pull.login_failed').length).toBeGreaterThanOrEqual(3)
  })
})

describe('a stranger', () => {
  test('gets no answer before a log-in', async () => {
    const client = await RawClient.open(port.port)
    const before = asked.length
    client.send(query(pull()))
    expect(fields((await client.until('E')).at(-1))).toMatchObject({ S: 'FATAL' })
    expect(asked.length).toBe(before)
  })

  test('a request of another shape, and any other statement, is an error and nothing more', async () => {
    const client = await RawClient.open(port.port)
    await client.logIn('hedgerow', 'pull', 'quay')
    for (const text of ['SELECT 1', 'pull {', 'pull {"kind":"release"}', `pull ${JSON.stringify({ ...request, args: [1] })}`]) {
      client.send(query(text))
      expect(fields((await client.until('Z'))[0])).toMatchObject({ S: 'ERROR', C: '42601' })
    }
    client.send(query("SET client_encoding = 'UTF8'"))
    expect((await client.until('Z'))[0]?.body.toString()).toBe('SET\0')
    client.send(query(pull({ text: 'throw' })))
    expect(fields((await client.until('Z'))[0])).toMatchObject({ C: 'XX000', M: expect.stringMatching(/^the answer failed \(reference [0-9a-f]{8}\)$/) })
    client.socket.destroy()
  })

  test('a cancel with a wrong key changes nothing', async () => {
    const client = await RawClient.open(port.port)
    const key = (await client.logIn('hedgerow', 'pull', 'quay')).find((each) => each.type === 'K')!.body
    client.send(query(pull({ text: 'wait' })))
    await expect.poll(() => asked.at(-1)?.request.text).toBe('wait')
    const { signal } = asked.at(-1)!
    const packet = (bytes: Buffer) => Buffer.concat([Buffer.from([0, 0, 0, 16, 4, 210, 22, 46]), bytes])
    const wrong = await RawClient.open(port.port)
    wrong.send(packet(Buffer.from(key.map((byte, index) => (index < 4 ? byte : byte ^ 1)))))
    await wrong.until('Z')
    expect(signal.aborted).toBe(false)
    const right = await RawClient.open(port.port)
    right.send(packet(key))
    await expect.poll(() => signal.aborted).toBe(true)
    expect(fields((await client.until('Z'))[0])).toMatchObject({ C: '57014' })
    client.socket.destroy()
  })

  test('meets ceilings on connections, on message length and on the time for a log-in', async () => {
    const small = await servePulls(options({ ceilings: { ...pullCeilings, message: 1_000, connections: 1 }, loginTimeoutMs: 150 }))
    const client = await RawClient.open(small.port)
    await client.logIn('hedgerow', 'pull', 'quay')
    const second = await RawClient.open(small.port)
    expect(fields((await second.until('E'))[0])).toMatchObject({ C: '53300' })
    client.send(query(`pull ${' '.repeat(1_000)}`))
    expect(fields((await client.until('E'))[0])).toMatchObject({ S: 'FATAL', C: '08P01' })
    client.socket.destroy()
    await expect
      .poll(async () => {
        const idle = await RawClient.open(small.port)
        const since = Date.now()
        const seen = await idle.until('E', 2_000)
        return seen.length === 0 && Date.now() - since > 100
      })
      .toBe(true)
    await small.close()
  })
})
