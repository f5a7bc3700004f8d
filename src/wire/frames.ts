/** What becomes of a frame, told from its header alone. */
export type Treatment = 'pass' | 'hold' | 'refuse'

export type Piece =
  /** Bytes of passing frames, as many as lie together; not cut at frame borders. */
  | { readonly kind: 'bytes'; readonly bytes: Buffer }
  /** A held frame, whole, with its header. */
  | { readonly kind: 'frame'; readonly type: number; readonly bytes: Buffer }
  /** A header that was refused or whose length cannot be; nothing follows. */
  | { readonly kind: 'broken'; readonly type: number; readonly length: number }

const headerBytes = 5
const firstHold = 16_384

/** A frame that grows as its bytes arrive. */
class Gathering {
  readonly #whole: number
  #bytes: Buffer
  #fill = 0

  constructor(whole: number) {
    this.#whole = whole
    this.#bytes = Buffer.allocUnsafe(Math.min(firstHold, whole))
  }

  add(source: Buffer, from: number, to: number): void {
    const fill = this.#fill + to - from
    if (fill > this.#bytes.length) {
      const grown = Buffer.allocUnsafe(Math.min(this.#whole, Math.max(fill, this.#bytes.length * 2)))
      this.#bytes.copy(grown, 0, 0, this.#fill)
      this.#bytes = grown
    }
    source.copy(this.#bytes, this.#fill, from, to)
    this.#fill = fill
  }

  piece(): Piece {
    return { kind: 'frame', type: this.#bytes.readUInt8(0), bytes: this.#bytes.subarray(0, this.#fill) }
  }
}

/**
 * Cuts a stream of typed frames (one byte of type, four of length that count themselves) arriving in chunks of any size. Passing frames stream
 * through in parts and are never gathered; a held frame grows as its bytes arrive, not by what its header promises.
 * `treat` is asked once for each header, in order, no earlier than the pieces before it were taken.
 */
export class Framer {
  readonly #treat: (type: number, length: number) => Treatment
  readonly #header = Buffer.alloc(headerBytes)
  #headerFill = 0
  #left = 0
  #held: Gathering | null = null
  #broken = false

  constructor(treat: (type: number, length: number) => Treatment) {
    this.#treat = treat
  }

  /** Whether the bytes taken so far end with a whole frame. */
  get between(): boolean {
    return this.#left === 0 && this.#headerFill === 0
  }

  *read(chunk: Buffer): Generator<Piece, void, undefined> {
    let at = 0
    let run = 0
    while (at < chunk.length && !this.#broken) {
      if (this.#left > 0) {
        const end = Math.min(chunk.length, at + this.#left)
        this.#left -= end - at
        if (this.#held !== null) {
          this.#held.add(chunk, at, end)
          run = end
          if (this.#left === 0) {
            yield this.#held.piece()
            this.#held = null
          }
        }
        at = end
        continue
      }
      const start = at
      const split = this.#headerFill > 0 || chunk.length - at < headerBytes
      if (split) {
        if (start > run) yield { kind: 'bytes', bytes: chunk.subarray(run, start) }
        at += chunk.copy(this.#header, this.#headerFill, at, Math.min(chunk.length, at + headerBytes - this.#headerFill))
        run = at
        this.#headerFill += at - start
        if (this.#headerFill < headerBytes) return
        this.#headerFill = 0
      } else at += headerBytes
      const source = split ? this.#header : chunk
      const place = split ? 0 : start
      const type = source.readUInt8(place)
      const length = source.readInt32BE(place + 1)
      const treatment = length < 4 ? 'refuse' : this.#treat(type, length)
      if (treatment === 'pass') {
        this.#left = length - 4
        if (split) yield { kind: 'bytes', bytes: Buffer.from(this.#header) }
        continue
      }
      if (!split && start > run) yield { kind: 'bytes', bytes: chunk.subarray(run, start) }
      if (treatment === 'refuse') {
        this.#broken = true
        yield { kind: 'broken', type, length }
        return
      }
      const end = start + 1 + length
      if (!split && end <= chunk.length) {
        at = end
        run = end
        yield { kind: 'frame', type, bytes: chunk.subarray(start, end) }
        continue
      }
      const held = new Gathering(1 + length)
      held.add(source, place, place + headerBytes)
      run = at
      this.#left = length - 4
      if (this.#left > 0) this.#held = held
      else yield held.piece()
    }
    if (at > run && !this.#broken) yield { kind: 'bytes', bytes: chunk.subarray(run, at) }
  }
}
