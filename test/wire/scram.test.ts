import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Breach } from '../../src/wire/breach.ts'
import { decoyKeys, ScramExchange, scramKeys } from '../../src/wire/scram.ts'

/** The exchange of RFC 7677 section 3: user "user", password "pencil". */
const rfc = {
  clientFirst: 'n,,n=user,r=rOprNGfwEbeRWgbNEkqO',
  serverNonce: '%hvYDpWUa2RaTCAfuxFIlj)hNlF$k0',
  serverFirst: 'r=rOprNGfwEbeRWgbNEkqO%hvYDpWUa2RaTCAfuxFIlj)hNlF$k0,s=W22ZaJ0SNY7soEsUEjb6gQ==,i=4096',
  clientFinal: 'c=biws,r=rOprNGfwEbeRWgbNEkqO%hvYDpWUa2RaTCAfuxFIlj)hNlF$k0,p=dHzbZapWIk4jUhN+Ute9ytag9zjfMHgsqmmiz7AndVQ=',
  serverFinal: 'v=6rriTRBi23WpRR/wtup+mMhUZUn/dB5nLTJRsjl95G4=',
}

const keys = scramKeys('pencil', Buffer.from('W22ZaJ0SNY7soEsUEjb6gQ==', 'base64'))

describe('ScramExchange', () => {
  test('speaks the exchange of RFC 7677', () => {
    const exchange = new ScramExchange(keys, rfc.serverNonce)
    expect(exchange.first(Buffer.from(rfc.clientFirst))).toBe(rfc.serverFirst)
    expect(exchange.final(Buffer.from(rfc.clientFinal))).toBe(rfc.serverFinal)
  })

  test('no proof passes but the right one', () => {
    const wrong = scramKeys('pencils', keys.salt)
    const exchange = new ScramExchange(wrong, rfc.serverNonce)
    exchange.first(Buffer.from(rfc.clientFirst))
    expect(exchange.final(Buffer.from(rfc.clientFinal))).toBeNull()
  })

  test('a decoy has a steady salt, or the one that is known, and lets nobody in', () => {
    const secret = Buffer.alloc(32, 7)
    const first = decoyKeys(secret, 'nobody', null)
    expect(decoyKeys(secret, 'nobody', null).salt).toEqual(first.salt)
    expect(decoyKeys(secret, 'somebody', null).salt).not.toEqual(first.salt)
    expect([first.salt.length, first.iterations]).toEqual([16, 4_096])
    const known = decoyKeys(secret, 'user', { salt: keys.salt, iterations: 4_096 })
    const exchange = new ScramExchange(known, rfc.serverNonce)
    expect(exchange.first(Buffer.from(rfc.clientFirst))).toBe(rfc.serverFirst)
    expect(exchange.final(Buffer.from(rfc.clientFinal))).toBeNull()
  })

  test('malformed messages are breaches of the protocol, whatever is in them', () => {
    const messages = ['', 'n', 'p=tls-unique,,n=,r=abc', 'n,a=ana,n=,r=abc', 'n,,m=x,n=,r=abc', 'n,,n=,r=', 'x,,n=,r=abc', 'n,,n=,r=a\0b']
    for (const message of messages) expect(() => new ScramExchange(keys).first(Buffer.from(message))).toThrow(Breach)
    const parts = ['c=biws', 'c=eSws', ',', 'r=', rfc.serverNonce, 'p=', 'AAAA', '=', 'x=1']
    fc.assert(
      fc.property(fc.array(fc.oneof(fc.constantFrom(...parts), fc.string({ maxLength: 8 })), { maxLength: 9 }), (pieces) => {
        const exchange = new ScramExchange(keys, rfc.serverNonce)
        exchange.first(Buffer.from(rfc.clientFirst))
        expect(() => exchange.final(Buffer.from(pieces.join('')))).toThrow(Breach)
      }),
      { numRuns: 2_000 },
    )
  })
})
