import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { codecOf, isSpoken } from '../../src/wire/text-encoding.ts'

const encodings = ['UTF8', 'SQL_ASCII', 'LATIN1', 'LATIN2', 'LATIN9', 'WIN1252', 'WIN1251', 'KOI8R', 'ISO_8859_8', 'EUC_JP', 'SJIS', 'BIG5']

describe('codecOf', () => {
  test('gives back the very bytes of every text it reads, in every encoding', () => {
    fc.assert(
      fc.property(fc.constantFrom(...encodings), fc.uint8Array({ maxLength: 60 }), (name, bytes) => {
        const codec = codecOf(name)
        const text = codec.decode(bytes)
        if (text !== null) expect(codec.encode(text)).toEqual(Buffer.from(bytes))
      }),
      { numRuns: 3_000 },
    )
  })

  test('reads what PostgreSQL means by each name', () => {
    expect(codecOf('LATIN1').decode(Uint8Array.of(0x80, 0xe9))).toBe('\x80\u00e9')
    expect(codecOf('WIN1252').decode(Uint8Array.of(0x80, 0xe9))).toBe('\u20ac\u00e9')
    expect(codecOf('KOI8R').decode(Uint8Array.of(0xc1))).toBe('\u0430')
    expect(codecOf('UTF8').decode(Uint8Array.of(0xef, 0xbb, 0xbf, 0x61))).toBe('\ufeffa')
    expect(codecOf('UTF8').decode(Uint8Array.of(0xc3, 0x28))).toBeNull()
  })

  test('in encodings it cannot write, ASCII passes and the rest does not', () => {
    expect(isSpoken('EUC_JP')).toBe(false)
    expect(codecOf('EUC_JP').decode(Buffer.from('SELECT 1'))).toBe('SELECT 1')
    expect(codecOf('EUC_JP').decode(Uint8Array.of(0xc6, 0xfc))).toBeNull()
  })

  test('writes a question mark for what an encoding lacks', () => {
    expect(codecOf('LATIN1').encode('1 \u20ac').toString('latin1')).toBe('1 ?')
    expect(codecOf('WIN1251').encode('\u0430\u00f6').toString('latin1')).toBe('\xe0?')
  })
})
