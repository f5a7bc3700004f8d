import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Framer, type Piece, type Treatment } from '../../src/wire/frames.ts'
import { frame } from '../../src/wire/messages.ts'

const treat = (type: number): Treatment => (type < 0x55 ? 'hold' : 'pass')

const frames = fc.array(fc.record({ type: fc.integer({ min: 0x41, max: 0x7a }), body: fc.uint8Array({ maxLength: 40 }) }), { maxLength: 12 })

function cut(bytes: Buffer, sizes: readonly number[]): readonly Buffer[] {
  const chunks: Buffer[] = []
  let at = 0
  for (let turn = 0; at < bytes.length; turn += 1) {
    const size = Math.max(1, sizes[turn % Math.max(1, sizes.length)] ?? 1)
    chunks.push(bytes.subarray(at, at + size))
    at += size
  }
  return chunks
}

function read(chunks: readonly Buffer[], by: (type: number, length: number) => Treatment = treat): readonly Piece[] {
  const framer = new Framer(by)
  return chunks.flatMap((chunk) => [...framer.read(Buffer.from(chunk))])
}

const joined = (pieces: readonly Piece[]) => Buffer.concat(pieces.map((piece) => (piece.kind === 'broken' ? Buffer.alloc(0) : piece.bytes)))

describe('Framer', () => {
  test('gives back every byte in order, however the stream is cut, and holds exactly the frames it was told to', () => {
    fc.assert(
      fc.property(frames, fc.array(fc.integer({ min: 1, max: 30 }), { maxLength: 8 }), (list, sizes) => {
        const whole = list.map(({ type, body }) => frame(String.fromCharCode(type), body))
        const pieces = read(cut(Buffer.concat(whole), sizes))
        expect(joined(pieces)).toEqual(Buffer.concat(whole))
        const held = pieces.flatMap((piece) => (piece.kind === 'frame' ? [piece.bytes] : []))
        expect(held).toEqual(whole.filter((each) => treat(each[0]!) === 'hold'))
      }),
      { numRuns: 2_000 },
    )
  })

  test('asks about each header once and in order', () => {
    fc.assert(
      fc.property(frames, fc.array(fc.integer({ min: 1, max: 9 }), { maxLength: 5 }), (list, sizes) => {
        const asked: number[] = []
        const stream = Buffer.concat(list.map(({ type, body }) => frame(String.fromCharCode(type), body)))
        read(cut(stream, sizes), (type) => {
          asked.push(type)
          return treat(type)
        })
        expect(asked).toEqual(list.map(({ type }) => type))
      }),
    )
  })

  test('never throws on random bytes, and says nothing after a broken header', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 300 }), fc.array(fc.integer({ min: 1, max: 50 }), { maxLength: 5 }), (bytes, sizes) => {
        const pieces = read(cut(Buffer.from(bytes), sizes), (type, length) => (length > 100 ? 'refuse' : treat(type)))
        const broken = pieces.findIndex((piece) => piece.kind === 'broken')
        if (broken >= 0) expect(broken).toBe(pieces.length - 1)
        expect(Buffer.from(bytes).subarray(0, joined(pieces).length)).toEqual(joined(pieces))
      }),
      { numRuns: 5_000 },
    )
  })

  test('does not copy frames that pass: their bytes are the chunk itself, in one piece', () => {
    const chunk = Buffer.concat([frame('d', Buffer.alloc(50)), frame('d', Buffer.alloc(0)), frame('d', Buffer.alloc(7))])
    const [piece, ...more] = [...new Framer(() => 'pass').read(chunk)]
    expect(more).toEqual([])
    expect(piece?.kind === 'bytes' && piece.bytes.buffer === chunk.buffer && piece.bytes.length === chunk.length).toBe(true)
  })

  test('a held frame takes memory as its bytes arrive, not as its header promises', () => {
    const framer = new Framer(() => 'hold')
    const before = process.memoryUsage().arrayBuffers
    expect([...framer.read(Buffer.from([0x51, 0x3f, 0xff, 0xff, 0xff, 1, 2, 3]))]).toEqual([])
    expect(process.memoryUsage().arrayBuffers - before).toBeLessThan(1_000_000)
    expect(framer.between).toBe(false)
  })
})
