import { readFileSync } from 'node:fs'
import { connect as connectTls } from 'node:tls'
import pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { frame, int32 } from '../../src/wire/messages.ts'
import { wireCeilings } from '../../src/wire/wire-options.ts'
import { ferryGate, tap, testLobby, type TestLobby } from './lobby.ts'
import { fields, query, RawClient, startupPacket, type Received } from './raw-client.ts'

const cert = readFileSync(new URL('quay.cert.pem', import.meta.url), 'utf8')
const key = readFileSync(new URL('quay.key.pem', import.meta.url), 'utf8')
const sslPacket = Buffer.concat([int32(8), int32(80877103)])
const gssPacket = Buffer.concat([int32(8), int32(80877104)])

let lobby: TestLobby

beforeAll(async () => {
  lobby = await testLobby()
})
afterAll(async () => {
  await lobby.stop()
})

async function attempt(user: string, database: string, password: string, port = lobby.wire.port): Promise<readonly Received[]> {
  const client = await RawClient.open(port)
  const seen = await client.logIn(user, database, password)
  client.socket.destroy()
  return seen
}

const saltIn = (seen: readonly Received[]) => /,s=([^,]+),i=(\d+)$/.exec(seen[1]?.body.toString('latin1') ?? '')?.slice(1)
const shape = (seen: readonly Received[]) =>
  seen.map((each) => ({ type: each.type, length: each.bytes.length, fields: each.type === 'E' ? fields(each) : null }))

describe('a log-in', () => {
  test('with the right password opens a session of the lobby', async () => {
    const seen = await attempt(lobby.user, lobby.database, lobby.password)
    expect(
      seen
        .filter((each) => each.type !== 'S')
        .map((each) => each.type)
        .join(''),
    ).toBe('RRRRKZ')
    expect(lobby.events).not.toContain('wire.login_failed')
  })

  test('of an unknown user, or into an unknown or foreign database, looks like one with a wrong password, byte by byte but for salt and nonce', async () => {
    const wrong = await attempt(lobby.user, lobby.database, 'pier')
    expect(fields(wrong.at(-1))).toEqual({
      S: 'FATAL',
      V: 'FATAL',
      C: '28P01',
      M: `password authentication failed for user "${lobby.user}"`,
    })
    for (const database of ['nosuch', 'postgres']) expect(shape(await attempt(lobby.user, database, lobby.password))).toEqual(shape(wrong))
    const stranger = lobby.user.replace(/^ana/, 'bob')
    const unknown = await attempt(stranger, lobby.database, 'pier')
    expect(shape(unknown)).toEqual(JSON.parse(JSON.stringify(shape(wrong)).replaceAll(lobby.user, stranger)))
    expect(lobby.events.filter((event) => event === 'wire.login_failed')).toHaveLength(4)
  })

  test('of an unknown user meets the same salt each time, and one of a known user in another database the salt that is known', async () => {
    const salt = Buffer.from('0123456789abcdef')
    const wire = await lobby.another({ saltOf: (user) => (user === lobby.user ? { salt, iterations: 5_000 } : null) })
    const once = saltIn(await attempt('nobody', lobby.database, 'x', wire.port))
    expect(once?.[1]).toBe('4096')
    expect(saltIn(await attempt('nobody', 'elsewhere', 'x', wire.port))).toEqual(once)
    expect(saltIn(await attempt(lobby.user, 'elsewhere', 'x', wire.port))).toEqual([salt.toString('base64'), '5000'])
  })

  test("of a pair that is not an analyst's brings no byte to the lobby", async () => {
    const wiretap = await tap(lobby.server.host, lobby.server.port)
    const wire = await lobby.another({ lobby: { host: '127.0.0.1', port: wiretap.port } })
    const superuser = new URL(lobby.server.url())
    const seen = await attempt(superuser.username, 'postgres', superuser.password, wire.port)
    expect(fields(seen.at(-1))).toMatchObject({ C: '28P01' })
    expect(wiretap.heard()).toHaveLength(0)
    wiretap.close()
  })

  test('never opens a replication connection, and loses no other parameter', async () => {
    const client = await RawClient.open(lobby.wire.port)
    const seen = await client.logIn(lobby.user, lobby.database, lobby.password, {
      replication: 'database',
      application_name: 'pier',
      options: '-c hedgerow.epsilon=0.2',
    })
    expect(seen.at(-1)?.type).toBe('Z')
    client.send(query("SELECT current_setting('application_name') || current_setting('hedgerow.epsilon')"))
    expect((await client.until('Z')).find((each) => each.type === 'D')?.body.toString('latin1', 6)).toBe('pier0.2')
    client.send(query('IDENTIFY_SYSTEM'))
    expect(fields((await client.until('Z'))[0])).toMatchObject({ C: '42601' })
    client.socket.destroy()
  })

  test('with a repeated user parameter is judged by the last, as PostgreSQL reads it', async () => {
    const wiretap = await tap(lobby.server.host, lobby.server.port)
    const wire = await lobby.another({ lobby: { host: '127.0.0.1', port: wiretap.port } })
    const heard: number[] = []
    for (const [first, last] of [
      [lobby.user, 'postgres'],
      ['postgres', lobby.user],
    ]) {
      const client = await RawClient.open(wire.port)
      const twice = Buffer.from(`user\0${first}\0user\0${last}\0database\0${lobby.database}\0\0`)
      client.send(int32(8 + twice.length), int32(196_608), twice)
      await client.until('R')
      heard.push(wiretap.heard().length)
      client.socket.destroy()
    }
    expect(heard[0]).toBe(0)
    expect(heard[1]).toBeGreaterThan(0)
    wiretap.close()
  })

  test('asks for protocol 3.2 and for options nobody knows, and the lobby negotiates', async () => {
    const client = await RawClient.open(lobby.wire.port)
    client.send(startupPacket({ user: lobby.user, database: lobby.database, '_pq_.nosuch': '1' }, 196_610))
    const seen = await client.until('R')
    expect(seen.map((each) => each.type).join('')).toBe('vR')
    client.socket.destroy()
  })

  test('a lobby that trusts everyone is not passed on', async () => {
    const { createServer } = await import('node:net')
    const { authenticationOk, readyForQuery } = await import('../../src/wire/messages.ts')
    for (const reply of [authenticationOk, frame('R', int32(3)), frame('R', int32(5), int32(77))]) {
      const trusting = createServer((socket) => {
        socket.on('error', () => undefined)
        socket.once('data', () => socket.write(Buffer.concat([reply, readyForQuery('I')])))
      })
      await new Promise<void>((resolve) => trusting.listen(0, '127.0.0.1', resolve))
      const address = trusting.address()
      const wire = await lobby.another({ lobby: { host: '127.0.0.1', port: typeof address === 'object' && address !== null ? address.port : 0 } })
      const client = await RawClient.open(wire.port)
      client.send(startupPacket({ user: lobby.user, database: lobby.database }))
      const seen = await client.until('E')
      expect(seen).toHaveLength(1)
      expect(fields(seen[0])).toMatchObject({ S: 'FATAL', C: '28000' })
      trusting.close()
    }
    expect(lobby.events).toContain('wire.lobby_without_scram')
  })

  test('while the lobby is away fails alike for everyone', async () => {
    const wire = await lobby.another({ lobby: { host: '127.0.0.1', port: 1 } })
    for (const user of [lobby.user, 'nobody']) {
      expect(fields((await attempt(user, lobby.database, 'x', wire.port)).at(-1))).toMatchObject({ C: '57P03', M: 'the lobby cannot be reached' })
    }
  })
})

describe('encryption', () => {
  test('without a certificate TLS and GSSAPI are declined, and the session goes on in plain', async () => {
    const client = await RawClient.open(lobby.wire.port)
    const answers: string[] = []
    for (const packet of [gssPacket, sslPacket]) {
      client.send(packet)
      answers.push(await new Promise<string>((resolve) => client.socket.once('data', (chunk: Buffer) => resolve(chunk.toString()))))
    }
    expect(answers).toEqual(['N', 'N'])
    client.socket.destroy()
  })

  test('with a certificate a whole session goes over TLS', async () => {
    const wire = await lobby.another({ tls: { cert, key } })
    const client = new pg.Client({ ...config(wire.port), ssl: { ca: cert, servername: 'localhost' } })
    await client.connect()
    expect((await client.query('SELECT count(*)::int AS n FROM riders')).rows).toEqual([{ n: 42 }])
    expect((await client.query("SELECT length(repeat('x', 3000000)) AS n")).rows).toEqual([{ n: 3_000_000 }])
    expect((await client.query("SELECT repeat('x', 3000000) AS long")).rows[0].long).toHaveLength(3_000_000)
    await client.end()
  })

  test('plaintext behind an SSLRequest is a breach, whether TLS is offered or not', async () => {
    const encrypted = await lobby.another({ tls: { cert, key } })
    for (const port of [encrypted.port, lobby.wire.port]) {
      const client = await RawClient.open(port)
      client.send(sslPacket, startupPacket({ user: lobby.user, database: lobby.database }))
      expect(fields((await client.until('E')).at(-1))).toMatchObject({ S: 'FATAL', C: '08P01', M: 'received unencrypted data after SSL request' })
    }
  })

  test('plaintext that comes where the handshake should ends the connection', async () => {
    const wire = await lobby.another({ tls: { cert, key } })
    const client = await RawClient.open(wire.port)
    client.send(sslPacket)
    await new Promise((resolve) => client.socket.once('data', resolve))
    client.send(startupPacket({ user: lobby.user, database: lobby.database }))
    await client.until('R')
    expect(client.closed).toBe(true)
  })

  test('a second SSLRequest under TLS is no protocol', async () => {
    const wire = await lobby.another({ tls: { cert, key } })
    const client = await RawClient.open(wire.port)
    client.send(sslPacket)
    await new Promise((resolve) => client.socket.once('data', resolve))
    client.socket.removeAllListeners('data')
    const inner = new RawClient(connectTls({ socket: client.socket, ca: cert, servername: 'localhost' }))
    inner.send(sslPacket)
    expect(fields((await inner.until('E')).at(-1))).toMatchObject({ C: '0A000' })
  })
})

describe('ceilings', () => {
  test('on connections, in all and for each address', async () => {
    const wire = await lobby.another({ ceilings: { ...wireCeilings, connections: 1 } })
    const first = await RawClient.open(wire.port)
    await first.logIn(lobby.user, lobby.database, lobby.password)
    const second = await RawClient.open(wire.port)
    expect(fields((await second.until('E')).at(-1))).toMatchObject({ C: '53300' })
    first.socket.destroy()
    await expect.poll(async () => (await attempt(lobby.user, lobby.database, lobby.password, wire.port)).at(-1)?.type).toBe('Z')
    const other = await lobby.another({ ceilings: { ...wireCeilings, connectionsPerAddress: 0 } })
    expect(fields((await (await RawClient.open(other.port)).until('E')).at(-1))).toMatchObject({ C: '53300' })
  })

  test('on the time for a log-in, silent or half-way', async () => {
    const wire = await lobby.another({ loginTimeoutMs: 100 })
    const silent = await RawClient.open(wire.port)
    await silent.until('E', 1_000)
    expect(silent.closed).toBe(true)
    const halfway = await RawClient.open(wire.port)
    halfway.send(startupPacket({ user: lobby.user, database: lobby.database }))
    await halfway.until('R')
    await halfway.until('E', 1_000)
    await expect.poll(() => halfway.closed).toBe(true)
  })
})

test('a gate that admits nobody admits nobody', async () => {
  const wire = await lobby.another({ gate: ferryGate('someone', 'else') })
  expect(fields((await attempt(lobby.user, lobby.database, lobby.password, wire.port)).at(-1))).toMatchObject({ C: '28P01' })
})

function config(port: number): pg.ClientConfig {
  return { host: '127.0.0.1', port, user: lobby.user, password: lobby.password, database: lobby.database }
}
