import fc from 'fast-check'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { frame, int32 } from '../../src/wire/messages.ts'
import { wireCeilings } from '../../src/wire/wire-options.ts'
import { testLobby, type TestLobby } from './lobby.ts'
import { fields, query, RawClient, startupPacket } from './raw-client.ts'

let lobby: TestLobby

beforeAll(async () => {
  lobby = await testLobby({ ceilings: { ...wireCeilings, statement: 10_000, message: 100_000 }, loginTimeoutMs: 1_500 })
})
afterAll(async () => {
  await lobby.stop()
})

async function raw(): Promise<RawClient> {
  const client = await RawClient.open(lobby.wire.port)
  await client.logIn(lobby.user, lobby.database, lobby.password)
  return client
}

async function goesOn(): Promise<void> {
  const client = await raw()
  client.send(query('SELECT count(*) FROM riders'))
  expect((await client.until('Z')).map((each) => each.type).join('')).toBe('TDCZ')
  client.socket.destroy()
}

describe('before log-in', () => {
  test('random bytes are answered with a FATAL error or nothing, and the wire goes on', async () => {
    const prefix = fc.constantFrom(
      Buffer.alloc(0),
      startupPacket({ user: lobby.user, database: lobby.database }),
      startupPacket({ user: 'nobody' }),
      Buffer.concat([int32(8), int32(80877104)]),
      Buffer.from([0, 0, 0, 40, 0, 3, 0, 0]),
    )
    let fatal = 0
    await fc.assert(
      fc.asyncProperty(prefix, fc.array(fc.uint8Array({ minLength: 1, maxLength: 60 }), { minLength: 1, maxLength: 8 }), async (start, parts) => {
        const client = await RawClient.open(lobby.wire.port)
        client.send(start, ...parts)
        client.socket.end()
        const seen = await client.until('Z', 5_000)
        for (const each of seen) expect('ERN').toContain(each.type)
        fatal += seen.filter((each) => each.type === 'E').length
        expect(client.closed).toBe(true)
      }),
      { numRuns: 400 },
    )
    expect(fatal).toBeGreaterThan(50)
    await goesOn()
  }, 25_000)

  test('a length that cannot be, a type that does not belong and a truncated packet are clear errors', async () => {
    const openings: readonly (readonly [Buffer, string, RegExp])[] = [
      [int32(3), '', /^$/],
      [Buffer.concat([int32(3), int32(196_608)]), '08P01', /invalid length of startup packet/],
      [Buffer.concat([int32(2_000_000_000), int32(196_608)]), '08P01', /invalid length of startup packet/],
      [Buffer.from('GET / HTTP/1.1\r\n\r\n'), '08P01', /invalid length of startup packet/],
      [Buffer.concat([int32(8), int32(131_072)]), '0A000', /unsupported frontend protocol 2\.0/],
      [Buffer.concat([int32(12), int32(196_608), Buffer.from('user')]), '08P01', /terminator/],
      [startupPacket({ database: 'x' }), '28000', /no PostgreSQL user name/],
      [Buffer.concat([int32(12), int32(80877102), int32(1)]), '08P01', /invalid length/],
    ]
    for (const [bytes, code, message] of openings) {
      const client = await RawClient.open(lobby.wire.port)
      client.socket.end(bytes)
      const error = fields((await client.until('E')).at(-1))
      expect([error['C'] ?? '', error['M'] ?? '']).toEqual([code, expect.stringMatching(message)])
    }
    for (const user of [lobby.user, 'nobody']) {
      for (const [bytes, message] of [
        [query('SELECT 1'), /message type/],
        [Buffer.concat([Buffer.from('p'), int32(2)]), /length/],
        [Buffer.concat([Buffer.from('p'), int32(1_000_000)]), /long|length/],
      ] as const) {
        const client = await RawClient.open(lobby.wire.port)
        client.send(startupPacket({ user, database: lobby.database }))
        await client.until('R')
        client.send(bytes)
        expect(fields((await client.until('E')).at(-1))).toMatchObject({ S: 'FATAL', C: '08P01', M: expect.stringMatching(message) })
      }
    }
  })
})

describe('after log-in', () => {
  test('an oversized, a negative and an unknown frame end the session with a clear error', async () => {
    const cases: readonly (readonly [Buffer, string])[] = [
      [Buffer.concat([Buffer.from('Q'), int32(10_001)]), '54000'],
      [Buffer.concat([Buffer.from('P'), int32(2_000_000_000)]), '54000'],
      [Buffer.concat([Buffer.from('d'), int32(100_001)]), '08P01'],
      [Buffer.concat([Buffer.from('B'), int32(-5)]), '08P01'],
      [frame('p', Buffer.from('again')), '08P01'],
      [frame('R', int32(0)), '08P01'],
      [Buffer.from([0, 0, 0, 0, 0]), '08P01'],
    ]
    for (const [bytes, code] of cases) {
      const client = await raw()
      client.send(bytes)
      expect(fields((await client.until('E')).at(-1))).toMatchObject({ S: 'FATAL', C: code })
      await expect.poll(() => client.closed).toBe(true)
    }
    await expect.poll(() => lobby.wire.sessions().size).toBe(0)
    await goesOn()
  })

  test('malformed Query and Parse bodies are turned away by PostgreSQL in its own words', async () => {
    const bodies = [
      frame('Q', Buffer.from('SELECT 1 FROM riders')),
      frame('Q', Buffer.from('SELECT 1\0riders\0')),
      frame('P', Buffer.from('\0SELECT 1 FROM riders\0\0')),
      frame('P', Buffer.from('riders')),
    ]
    for (const body of bodies) {
      const client = await raw()
      client.send(body, frame('S'))
      const error = (await client.until('E')).at(-1)
      expect(fields(error)['C']).toBe('08P01')
      client.socket.destroy()
    }
    await goesOn()
  })

  test('random frames never bring the wire down, nor a session to a stop that is not an answer or an end', async () => {
    const types = fc.constantFrom(...'QPBEDCHSFdcfXpRZz')
    const frames = fc.array(fc.tuple(types, fc.uint8Array({ maxLength: 30 })), { minLength: 1, maxLength: 30 })
    await fc.assert(
      fc.asyncProperty(frames, async (list) => {
        const client = await raw()
        client.send(...list.map(([type, body]) => frame(type, body)), frame('S'), frame('X'))
        client.socket.end()
        await client.until('?', 5_000)
        expect(client.closed).toBe(true)
      }),
      { numRuns: 40 },
    )
    await expect.poll(() => lobby.wire.sessions().size).toBe(0)
    await goesOn()
  }, 25_000)

  test('a gate that breaks costs the statement, not the session, and tells nothing', async () => {
    const wire = await lobby.another({
      gate: {
        admits: () => true,
        mentions: (_, text) => Buffer.from(text).includes('riders'),
        judge: () => Promise.reject(new Error('a text that must not get out')),
      },
    })
    const client = await RawClient.open(wire.port)
    await client.logIn(lobby.user, lobby.database, lobby.password)
    client.send(query('SELECT 1 FROM riders'))
    const error = fields((await client.until('Z'))[0])
    expect(error).toMatchObject({ S: 'ERROR', C: 'XX000', M: expect.stringMatching(/^the statement could not be judged \(reference [0-9a-f]{8}\)$/) })
    client.send(query('SELECT 1'))
    expect((await client.until('Z')).map((each) => each.type).join('')).toBe('TDCZ')
    client.socket.destroy()
    expect(lobby.events).toContain('wire.gate_failed')
  })
})
