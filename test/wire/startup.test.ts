import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Breach } from '../../src/wire/breach.ts'
import { readStartup } from '../../src/wire/startup.ts'
import { startupPacket } from './raw-client.ts'

describe('readStartup', () => {
  test('keeps the very packet, and drops replication alone', () => {
    const plain = startupPacket({ user: 'ana', database: 'ferries', application_name: 'pier' })
    expect(readStartup(plain).packet).toBe(plain)
    const walker = startupPacket({ replication: 'true', user: 'ana', database: 'ferries', application_name: 'pier' })
    expect(readStartup(walker).packet).toEqual(plain)
  })

  test('the database is the user\u2019s name where none is given', () => {
    expect(readStartup(startupPacket({ user: 'ana' })).database).toBe('ana')
    expect(readStartup(startupPacket({ user: 'ana', database: '' })).database).toBe('ana')
  })

  test('a name that is not UTF-8 is nobody', () => {
    const packet = startupPacket({ user: 'an~' })
    packet[packet.indexOf(0x7e)] = 0xff
    expect(readStartup(packet).user).toBeNull()
  })

  test('any bytes are read or are a breach', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 80 }), fc.boolean(), (bytes, three) => {
        const packet = Buffer.concat([Buffer.from([0, 0, 0, 0]), three ? Buffer.from([0, 3, 0, 0]) : Buffer.alloc(4), bytes])
        try {
          expect(readStartup(packet).major).toBe(3)
        } catch (error) {
          if (!(error instanceof Breach)) throw error
        }
      }),
      { numRuns: 5_000 },
    )
  })
})
