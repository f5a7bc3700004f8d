import pg from 'pg'
import postgres from 'postgres'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { frame } from '../../src/wire/messages.ts'
import { RawClient, extended, fields, query, sync } from './raw-client.ts'
import { testLobby, type TestLobby } from './lobby.ts'

let lobby: TestLobby

beforeAll(async () => {
  lobby = await testLobby()
})
afterAll(async () => {
  await lobby.stop()
})

async function connected(): Promise<pg.Client> {
  const client = new pg.Client({ connectionString: lobby.url() })
  client.on('error', () => undefined)
  await client.connect()
  return client
}

async function raw(): Promise<RawClient> {
  const client = await RawClient.open(lobby.wire.port)
  const greeting = await client.logIn(lobby.user, lobby.database, lobby.password)
  expect(greeting.at(-1)?.type).toBe('Z')
  return client
}

const types = (received: readonly { readonly type: string }[]) => received.map((each) => each.type).join('')

describe('drivers through the wire', () => {
  test('pg gets answers to plain and to rewritten statements, with and without parameters, in text and in binary', async () => {
    const client = await connected()
    expect((await client.query('SELECT 1 AS one')).rows).toEqual([{ one: 1 }])
    expect((await client.query('SELECT count(*)::int AS n FROM riders')).rows).toEqual([{ n: 42 }])
    expect((await client.query('SELECT count(*)::int AS n FROM riders WHERE rider > $1', [40])).rows).toEqual([{ n: 2 }])
    for (const floor of [0, 10, 41]) {
      const named = { name: 'above', text: 'SELECT count(*)::int AS n FROM riders WHERE rider > $1', values: [floor], binary: true }
      expect((await client.query(named)).rows).toEqual([{ n: 42 - floor }])
    }
    await client.end()
  })

  test('postgres in its default mode prepares, pipelines and reads', async () => {
    const sql = postgres(lobby.url(), { max: 2 })
    const answers = await Promise.all(Array.from({ length: 20 }, (_, floor) => sql`SELECT count(*)::int AS n FROM riders WHERE rider > ${floor}`))
    expect(answers.map((rows) => rows[0]?.['n'])).toEqual(Array.from({ length: 20 }, (_, floor) => 42 - floor))
    await sql.end()
  })

  test('a session is listed under the process number of its backend while it lasts', async () => {
    const client = await connected()
    const pid = (await client.query('SELECT pg_backend_pid() AS pid')).rows[0].pid
    expect(lobby.wire.sessions().get(pid)).toMatchObject({ user: lobby.user, database: lobby.database, pid })
    await client.end()
    await expect.poll(() => lobby.wire.sessions().has(pid)).toBe(false)
  })

  test('a session can be ended from outside', async () => {
    const client = await raw()
    const session = [...lobby.wire.sessions().values()].at(-1)!
    session.end('57P01', 'terminating connection due to administrator command')
    const farewell = await client.until('E')
    expect(fields(farewell.at(-1))).toMatchObject({ S: 'FATAL', C: '57P01' })
  })
})

describe('refusals', () => {
  test('a refused statement fails with the refusal, whole, in the simple protocol', async () => {
    const client = await raw()
    client.send(query('SELECT 1; SELECT * FROM secrets; SELECT 2'))
    const reply = await client.until('Z')
    expect(types(reply)).toBe('TDCEZ')
    expect(fields(reply.at(-2))).toEqual({
      S: 'ERROR',
      V: 'ERROR',
      C: '42501',
      M: 'rows of people stay closed [rows.private]',
      H: 'SELECT count(*) FROM riders',
      P: '25',
    })
    client.socket.destroy()
  })

  test('a refused Parse fails with the refusal, and the rest up to Sync is skipped', async () => {
    const client = await raw()
    client.send(extended('SELECT * FROM secrets'), extended('SELECT 1'), sync, extended('SELECT 2'), sync)
    const first = await client.until('Z')
    expect(types(first)).toBe('EZ')
    expect(fields(first[0])).toMatchObject({ C: '42501', P: '15' })
    expect(types(await client.until('Z'))).toBe('12TDCZ')
    client.socket.destroy()
  })

  test('each refusal of a pipeline meets its own statement', async () => {
    const client = await raw()
    client.send(extended('SELECT rider FROM secrets'), sync, extended('SELECT count(*) FROM riders'), sync, extended('SELECT 1, 2, 3 FROM secrets'), sync)
    const [first, second, third] = [await client.until('Z'), await client.until('Z'), await client.until('Z')]
    expect(fields(first[0])['P']).toBe('19')
    expect(types(second)).toBe('12TDCZ')
    expect(fields(third[0])['P']).toBe('21')
    client.socket.destroy()
  })

  test('a refusal aborts the transaction, and in an aborted one PostgreSQL speaks first', async () => {
    const client = await connected()
    await client.query('BEGIN')
    await expect(client.query('SELECT * FROM secrets')).rejects.toMatchObject({ code: '42501' })
    await expect(client.query('SELECT * FROM secrets')).rejects.toMatchObject({ code: '25P02' })
    await expect(client.query('SELECT * FROM secrets WHERE 1 = $1', [1])).rejects.toMatchObject({ code: '25P02' })
    await client.query('ROLLBACK')
    expect((await client.query('SELECT 1 AS one')).rows).toEqual([{ one: 1 }])
    await client.end()
  })

  test('a savepoint brings the transaction back after a refusal', async () => {
    const client = await connected()
    await client.query('BEGIN; SAVEPOINT pier')
    await expect(client.query('SELECT * FROM secrets')).rejects.toMatchObject({ code: '42501' })
    await client.query('ROLLBACK TO pier')
    expect((await client.query('SELECT count(*)::int AS n FROM riders')).rows).toEqual([{ n: 42 }])
    await client.end()
  })

  test('an undefined function of the analyst stays an undefined function, with its place', async () => {
    const client = await connected()
    await expect(client.query('SELECT nosuch(1)')).rejects.toMatchObject({ code: '42883', position: '8' })
    await client.end()
  })
})

describe('errors and notices of the lobby', () => {
  test('the context that names functions of Hedgerow is left out, the rest stays', async () => {
    const client = await raw()
    client.send(query("SELECT hedgerow.raise('42501')"))
    const reply = await client.until('Z')
    expect(types(reply)).toBe('TNEZ')
    const [notice, error] = reply.filter((each) => 'NE'.includes(each.type)).map(fields)
    expect(notice).toMatchObject({ M: 'spent 0.1' })
    expect(error).toMatchObject({ C: '42501', M: 'the budget is spent', H: 'wait' })
    expect(Object.keys({ ...notice, ...error }).filter((letter) => 'WPpq'.includes(letter))).toEqual([])
    client.socket.destroy()
  })

  test('a position in a rewritten text is left out, one in an untouched text is kept', async () => {
    const client = await raw()
    client.send(query('SELECT nothing FROM riders'))
    expect(fields((await client.until('Z')).at(-2))).not.toHaveProperty('P')
    client.send(query('SELECT nothing'))
    expect(fields((await client.until('Z')).at(-2))).toMatchObject({ C: '42703', P: '8' })
    client.socket.destroy()
  })

  test('text in LATIN1 is judged as what it says, and a refusal comes back in LATIN1', async () => {
    const client = await raw()
    client.send(query("SET client_encoding = 'LATIN1'"))
    await client.until('Z')
    client.send(frame('Q', Buffer.from("SELECT 'p\u00f6l\u00e4r' || count(*) FROM riders\0", 'latin1')))
    const reply = await client.until('Z')
    expect(reply.find((each) => each.type === 'D')?.body.toString('latin1', 6)).toBe('p\u00f6l\u00e4r42')
    client.socket.destroy()
  })

  test('text in an encoding that cannot be written back is refused where it is more than ASCII', async () => {
    const client = await raw()
    client.send(query("SET client_encoding = 'EUC_JP'"))
    await client.until('Z')
    client.send(query('SELECT count(*) FROM riders'))
    expect(types(await client.until('Z'))).toBe('TDCZ')
    client.send(frame('Q', Buffer.from("SELECT '\xc6\xfc', count(*) FROM riders\0", 'latin1')))
    expect(fields((await client.until('Z')).at(-2))).toMatchObject({ C: '22021', M: 'a statement over private tables cannot be read in EUC_JP' })
    client.socket.destroy()
  })

  test('invalid UTF-8 is turned away by PostgreSQL, and the session goes on', async () => {
    const client = await raw()
    client.send(frame('Q', Buffer.from("SELECT '\xc3(' FROM riders\0", 'latin1')))
    expect(fields((await client.until('Z')).at(-2))).toMatchObject({ C: '22021' })
    client.send(query('SELECT 1'))
    expect(types(await client.until('Z'))).toBe('TDCZ')
    client.socket.destroy()
  })
})
