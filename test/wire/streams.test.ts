import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { frame, int32 } from '../../src/wire/messages.ts'
import { tap, testLobby, type TestLobby } from './lobby.ts'
import { extended, fields, query, RawClient, startupPacket, sync } from './raw-client.ts'

let lobby: TestLobby
let observer: pg.Client

beforeAll(async () => {
  lobby = await testLobby()
  observer = await lobby.direct()
  await observer.query(`CREATE TABLE public.notes (n int, said text); GRANT ALL ON public.notes TO ${lobby.user}`)
})
afterAll(async () => {
  await observer.end()
  await lobby.stop()
})

async function raw(port = lobby.wire.port): Promise<RawClient & { pid: number; key: Buffer }> {
  const client = await RawClient.open(port)
  const key = (await client.logIn(lobby.user, lobby.database, lobby.password)).find((each) => each.type === 'K')!.body
  return Object.assign(client, { pid: key.readUInt32BE(0), key })
}

const types = (received: readonly { readonly type: string }[]) => received.map((each) => each.type).join('')
const states = async (pid: number) => (await observer.query('SELECT state FROM pg_stat_activity WHERE pid = $1', [pid])).rows.map((row) => row.state as string)
const running = (pid: number) => expect.poll(() => states(pid)).toEqual(['active'])
const left = (pid: number) => expect.poll(() => states(pid), { timeout: 1_000, interval: 20 }).toEqual([])

describe('what mentions nothing private', () => {
  test('reaches the lobby byte for byte, however it was cut on the way', async () => {
    const wiretap = await tap(lobby.server.host, lobby.server.port)
    const wire = await lobby.another({ lobby: { host: '127.0.0.1', port: wiretap.port } })
    const client = await raw(wire.port)
    const sent = Buffer.concat([
      query("SELECT 'a''b', $q$\u00f6$q$ -- kept"),
      extended('SELECT $1::int', ['5']),
      frame('H'),
      sync,
      query(''),
      frame('Q', Buffer.from('no end')),
      query('SELECT 1; SELECT 2'),
      frame('C', Buffer.from('Snosuch\0')),
      sync,
    ])
    const from = wiretap.heard().length
    for (const byte of sent) {
      client.send(Buffer.from([byte]))
      await new Promise((resolve) => setImmediate(resolve))
    }
    for (let answers = 0; answers < 6; answers += 1) await client.until('Z')
    expect(wiretap.heard().subarray(from)).toEqual(sent)
    const again = wiretap.heard().length
    client.send(sent)
    for (let answers = 0; answers < 6; answers += 1) await client.until('Z')
    expect(wiretap.heard().subarray(again)).toEqual(sent)
    client.socket.destroy()
    wiretap.close()
  })

  test('waits in order behind a statement that is being judged', async () => {
    const client = await raw()
    client.send(query('SELECT count(*) AS slowly FROM riders'), query('SELECT 2'), extended('SELECT 3'), sync)
    const values: string[] = []
    for (let answers = 0; answers < 3; answers += 1) values.push((await client.until('Z')).find((each) => each.type === 'D')!.body.toString('latin1', 6))
    expect(values).toEqual(['42', '2', '3'])
    client.socket.destroy()
  })

  test('a statement split at every byte is judged whole', async () => {
    const client = await raw()
    const sent = Buffer.concat([extended('SELECT count(*) FROM riders WHERE rider > $1', ['40']), sync])
    for (let cut = 1; cut < sent.length; cut += 1) {
      client.send(sent.subarray(0, cut))
      await new Promise((resolve) => setImmediate(resolve))
      client.send(sent.subarray(cut))
      expect((await client.until('Z')).find((each) => each.type === 'D')!.body.toString('latin1', 6)).toBe('2')
    }
    client.socket.destroy()
  })

  test('a statement of a megabyte passes', async () => {
    const client = await raw()
    client.send(query(`SELECT length('${'x'.repeat(1_000_000)}')`))
    expect((await client.until('Z')).find((each) => each.type === 'D')!.body.toString('latin1', 6)).toBe('1000000')
    client.socket.destroy()
  })
})

describe('COPY', () => {
  test('in and out, with names of private tables in the data, is left alone', async () => {
    const client = await raw()
    client.send(query('COPY notes FROM STDIN'))
    expect(types(await client.until('G'))).toBe('G')
    for (let n = 0; n < 2_000; n += 1) client.send(frame('d', Buffer.from(`${n}\tSELECT * FROM secrets, riders\n`)))
    client.send(frame('c'))
    expect(types(await client.until('Z'))).toBe('CZ')
    client.send(query('COPY (SELECT * FROM notes ORDER BY n) TO STDOUT'))
    const out = await client.until('Z')
    expect(out.filter((each) => each.type === 'd')).toHaveLength(2_000)
    client.send(query('TRUNCATE notes'))
    await client.until('Z')
    client.socket.destroy()
  })

  test('whose Sync the lobby swallows leaves the session as it was', async () => {
    const client = await raw()
    const copy = Buffer.concat([
      frame('P', Buffer.from('\0COPY notes FROM STDIN\0\0\0')),
      frame('B', Buffer.from('\0\0\0\0\0\0\0\0')),
      frame('E', Buffer.from('\0\0\0\0\0')),
    ])
    client.send(copy, sync)
    await client.until('G')
    client.send(frame('d', Buffer.from('1\tone\n')), frame('c'), sync)
    await client.until('Z')
    expect(lobby.wire.sessions().get(client.pid)?.idle).toBe(true)
    client.send(query('SELECT nothing FROM riders'))
    expect(fields((await client.until('Z')).at(-2))).not.toHaveProperty('P')
    client.send(query('SELECT nothing'))
    expect(fields((await client.until('Z')).at(-2))).toHaveProperty('P')
    client.socket.destroy()
  })

  test('that fails leaves the session usable', async () => {
    const client = await raw()
    client.send(query('COPY notes FROM STDIN'))
    await client.until('G')
    client.send(frame('d', Buffer.from('not a number\tx\n')), frame('c'))
    expect(fields((await client.until('Z')).at(-2))).toMatchObject({ C: '22P02' })
    client.send(query('SELECT count(*) FROM riders'))
    expect(types(await client.until('Z'))).toBe('TDCZ')
    expect(lobby.wire.sessions().get(client.pid)?.idle).toBe(true)
    client.socket.destroy()
  })
})

describe('a reader that stops', () => {
  test('holds up a result of a hundred megabytes, and the wire stays small', async () => {
    const client = await raw()
    client.socket.pause()
    const before = process.memoryUsage()
    client.send(query("SELECT repeat('x', 1000000) FROM generate_series(1, 100)"))
    await running(client.pid)
    let peak = 0
    for (let turn = 0; turn < 25; turn += 1) {
      await new Promise((resolve) => setTimeout(resolve, 20))
      const now = process.memoryUsage()
      peak = Math.max(peak, now.arrayBuffers - before.arrayBuffers + now.heapUsed - before.heapUsed)
    }
    expect(peak).toBeLessThan(30_000_000)
    expect(await states(client.pid)).toEqual(['active'])
    client.socket.removeAllListeners('data')
    let bytes = 0
    await new Promise<void>((resolve) => {
      client.socket.on('data', (chunk: Buffer) => {
        bytes += chunk.length
        if (bytes > 100_000_000) resolve()
      })
      client.socket.resume()
    })
    client.socket.destroy()
  })

  test('and is killed there takes its backend along', async () => {
    const client = await raw()
    client.socket.pause()
    client.send(query("SELECT repeat('x', 1000000) FROM generate_series(1, 100)"))
    await running(client.pid)
    client.socket.resetAndDestroy()
    await left(client.pid)
  })
})

describe('a client that goes away', () => {
  test('in the middle of a statement takes its backend along within a second', async () => {
    for (const leave of [(client: RawClient) => client.socket.destroy(), (client: RawClient) => client.socket.resetAndDestroy()]) {
      const client = await raw()
      client.send(query('SELECT pg_sleep(60)'), query('SELECT pg_sleep(60)'))
      await running(client.pid)
      leave(client)
      await left(client.pid)
      expect(lobby.wire.sessions().has(client.pid)).toBe(false)
    }
  })

  test('after Terminate with a statement under way takes it along as well', async () => {
    const client = await raw()
    client.send(query('SELECT pg_sleep(60)'), frame('X'))
    await running(client.pid)
    client.socket.end()
    await left(client.pid)
  })

  test('while its statement is judged leaves nothing behind', async () => {
    const client = await raw()
    client.send(query('SELECT count(*) AS slowly FROM riders'))
    await new Promise((resolve) => setTimeout(resolve, 30))
    client.socket.destroy()
    await left(client.pid)
  })
})

describe('cancel', () => {
  test('is relayed to the lobby and ends the statement, not the session', async () => {
    const client = await raw()
    client.send(query('SELECT pg_sleep(60)'))
    await running(client.pid)
    const canceller = await RawClient.open(lobby.wire.port)
    canceller.send(int32(12 + client.key.length - 4), int32(80877102), client.key)
    expect(fields((await client.until('Z')).find((each) => each.type === 'E'))).toMatchObject({ C: '57014' })
    await expect.poll(() => canceller.closed).toBe(true)
    client.send(query('SELECT 1'))
    expect(types(await client.until('Z'))).toBe('TDCZ')
    client.socket.destroy()
  })

  test("with a key of any length that is not the session's does nothing", async () => {
    const client = await raw()
    client.send(query('SELECT pg_sleep(0.4)'))
    await running(client.pid)
    for (const key of [Buffer.from([1, 2, 3, 4]), Buffer.alloc(32, 1), Buffer.alloc(256, 1)]) {
      const canceller = await RawClient.open(lobby.wire.port)
      canceller.send(int32(12 + key.length), int32(80877102), client.key.subarray(0, 4), key)
      await canceller.until('Z')
    }
    expect(types(await client.until('Z'))).toBe('TDCZ')
    client.socket.destroy()
  })
})

describe('the lobby', () => {
  test('that ends a session says so itself, and the client sees it once', async () => {
    const client = await raw()
    await observer.query('SELECT pg_terminate_backend($1)', [client.pid])
    const seen = await client.until('Z')
    expect(types(seen)).toBe('E')
    expect(fields(seen[0])).toMatchObject({ S: 'FATAL', C: '57P01' })
  })

  test('that vanishes is reported, where a message can be sent', async () => {
    const wiretap = await tap(lobby.server.host, lobby.server.port)
    const wire = await lobby.another({ lobby: { host: '127.0.0.1', port: wiretap.port } })
    const client = await raw(wire.port)
    wiretap.close()
    expect(fields((await client.until('E')).at(-1))).toMatchObject({ S: 'FATAL', C: '08006' })
    await expect.poll(() => wire.sessions().size).toBe(0)
  })
})

describe('close', () => {
  test('ends idle sessions at once, lets a statement finish, and takes nobody new', async () => {
    const wire = await lobby.another({})
    const idle = await raw(wire.port)
    const busy = await raw(wire.port)
    busy.send(query('SELECT pg_sleep(0.4)'))
    await running(busy.pid)
    const closed = wire.close()
    expect(fields((await idle.until('E')).at(-1))).toMatchObject({ S: 'FATAL', C: '57P01' })
    expect(types(await busy.until('E'))).toBe('TDCZE')
    await closed
    await expect(RawClient.open(wire.port)).rejects.toMatchObject({ code: 'ECONNREFUSED' })
  })

  test('ends what is still under way after its limit', async () => {
    const wire = await lobby.another({ drainMs: 200 })
    const busy = await raw(wire.port)
    busy.send(query('BEGIN; SELECT pg_sleep(60)'))
    await running(busy.pid)
    await wire.close()
    expect(fields((await busy.until('Z')).at(-1))).toMatchObject({ C: '57P01' })
    await left(busy.pid)
  })
})

test('a start-up packet that comes byte by byte is read', async () => {
  const client = await RawClient.open(lobby.wire.port)
  for (const byte of startupPacket({ user: lobby.user, database: lobby.database })) {
    client.send(Buffer.from([byte]))
    await new Promise((resolve) => setImmediate(resolve))
  }
  expect(types(await client.until('R'))).toBe('R')
  client.socket.destroy()
})
