import { connect } from 'node:net'
import pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { ferries, ferryPolicy } from './ferries.ts'

let server: TestHedgerow
let vault: pg.Client
let activity: pg.Client
let watcher: pg.Client
beforeAll(async () => {
  // the real clock, and a reply that leaves after 3 s: what ends sooner was not waited for
  server = await ferries({ clock: 'real', policy: ferryPolicy.replace('reply_after: 0.1s', 'reply_after: 3s') })
  vault = await server.vault()
  activity = await server.vault()
  watcher = await server.connect('ben')
})
afterAll(() => server.stop())

/** Queries that the vault is running for Hedgerow. */
async function running(): Promise<number> {
  const { rows } = await activity.query(
    `SELECT count(*) AS n FROM pg_stat_activity WHERE datname = 'people_vault' AND pid <> pg_backend_pid() AND state = 'active' AND wait_event_type = 'Lock'`,
  )
  return Number(rows[0].n)
}

async function eventually(fact: () => Promise<boolean>, withinMs = 5_000): Promise<void> {
  const deadline = Date.now() + withinMs
  while (!(await fact())) {
    if (Date.now() > deadline) throw new Error('it did not come about')
    await new Promise((resolve) => setTimeout(resolve, 20))
  }
}

async function withVaultHeld(work: () => Promise<void>): Promise<void> {
  await vault.query('BEGIN')
  await vault.query('LOCK TABLE trips IN ACCESS EXCLUSIVE MODE')
  try {
    await work()
  } finally {
    await vault.query('ROLLBACK')
  }
}

async function spent(of: pg.Client): Promise<number> {
  return Number((await of.query('SELECT count(*) FROM hedgerow.charges')).rows[0].count)
}

/** Sends a CancelRequest as libpq does, over a connection of its own. */
async function cancel(client: pg.Client): Promise<void> {
  const { processID, secretKey } = client as unknown as { readonly processID: number; readonly secretKey: number }
  const packet = Buffer.alloc(16)
  packet.writeInt32BE(16, 0)
  packet.writeInt32BE(80_877_102, 4)
  packet.writeInt32BE(processID, 8)
  packet.writeInt32BE(secretKey, 12)
  const socket = connect(server.hedgerow.port, '127.0.0.1')
  socket.on('error', () => undefined)
  socket.write(packet)
  await new Promise((resolve) => socket.once('close', resolve))
}

async function failure(answer: Promise<unknown>): Promise<pg.DatabaseError & { readonly afterMs: number }> {
  const start = Date.now()
  const problem = (await answer.then(
    () => new Error('it was answered'),
    (error: unknown) => error,
  )) as pg.DatabaseError
  return Object.assign(problem, { afterMs: Date.now() - start })
}

test('a cancel during a pull ends in 57014 at once, stops the vault’s query, and the debit stands', async () => {
  const client = await server.connect('ana')
  const before = await spent(client)
  await withVaultHeld(async () => {
    const answer = failure(client.query('SELECT count(*) FROM trips'))
    await eventually(async () => (await running()) === 1)
    await cancel(client)
    expect(await answer).toMatchObject({ code: '57014', message: 'canceling statement due to user request' })
    expect((await answer).afterMs).toBeLessThan(2_500)
    await eventually(async () => (await running()) === 0)
  })
  expect(await spent(client)).toBe(before + 1)
  expect((await client.query('SELECT count(*) FROM riders')).rows).toEqual([{ count: '300' }])
})

test('statement_timeout during a pull does the same', async () => {
  const client = await server.connect('ana')
  const before = await spent(client)
  await withVaultHeld(async () => {
    await client.query("SET statement_timeout = '600ms'")
    const answer = failure(client.query('SELECT count(*) FROM trips'))
    await eventually(async () => (await running()) === 1)
    expect(await answer).toMatchObject({ code: '57014', message: 'canceling statement due to statement timeout' })
    expect((await answer).afterMs).toBeLessThan(2_500)
    await eventually(async () => (await running()) === 0)
  })
  await client.query('RESET statement_timeout')
  expect(await spent(client)).toBe(before + 1)
})

test('a client that is gone takes its vault query with it', async () => {
  const client = new pg.Client(server.url('ana'))
  client.on('error', () => undefined)
  await client.connect()
  await withVaultHeld(async () => {
    const answer = failure(client.query('SELECT count(*) FROM trips'))
    await eventually(async () => (await running()) === 1)
    ;(client as unknown as { readonly connection: { readonly stream: { destroy(): void } } }).connection.stream.destroy()
    await answer
    await eventually(async () => (await running()) === 0)
  })
})

test('a time-out before the reply’s instant looks the same whether or not the vault had finished', async () => {
  const client = await server.connect('ana')
  await client.query("SET statement_timeout = '1s'")
  const told = async (): Promise<readonly unknown[]> => {
    const { code, message, hint, detail, where } = await failure(client.query('SELECT count(*) FROM trips'))
    return [code, message, hint, detail, where]
  }
  const finished = await told()
  await withVaultHeld(async () => expect(await told()).toEqual(finished))
  expect(finished.slice(0, 2)).toEqual(['57014', 'canceling statement due to statement timeout'])
})

test('an answer leaves at its instant, however soon the vault has finished', async () => {
  const client = await server.connect('ana')
  const start = Date.now()
  await client.query('SELECT count(*) FROM riders')
  expect(Date.now() - start).toBeGreaterThanOrEqual(2_950)
})

test('many sessions of one analyst that wait for the vault do not hold up another’s beyond the time class', async () => {
  const crowd = await Promise.all(Array.from({ length: 16 }, () => server.connect('ana')))
  const answers: Promise<unknown>[] = []
  answers.push(...crowd.map((client) => client.query('SELECT count(*) FROM riders').catch((problem: unknown) => problem)))
  await new Promise((resolve) => setTimeout(resolve, 300))
  const start = Date.now()
  await watcher.query('SELECT count(*) FROM riders')
  const waited = Date.now() - start
  for (const client of crowd) await cancel(client)
  await Promise.all(answers)
  // no more than the time class of its own reply: there was a place
  expect(waited).toBeLessThan(4_500)
})
