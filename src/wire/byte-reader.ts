import type { Socket } from 'node:net'
import { Breach, Gone } from './breach.ts'

const smallest = 1_024

/** A frame without its header. */
export interface Frame {
  readonly type: string
  readonly body: Buffer
}

/**
 * Reads a socket by exact lengths, for the conversations that go one message at a time: start-up, and the pull port. Bytes that were not asked
 * for wait in the socket once `readAhead` of them are here. Rejects with Gone when the other side closes.
 */
export class ByteReader {
  readonly #socket: Socket
  readonly #readAhead: number
  #buffer = Buffer.allocUnsafe(smallest)
  #from = 0
  #to = 0
  #wanted: { readonly count: number; readonly resolve: (bytes: Buffer) => void; readonly reject: (reason: Gone) => void } | null = null
  #gone = false

  constructor(socket: Socket, readAhead = 65_536) {
    this.#socket = socket
    this.#readAhead = readAhead
    socket.on('data', this.#take)
    socket.on('end', this.#close)
    socket.on('close', this.#close)
    if (socket.destroyed) this.#close()
  }

  /** Bytes that are here and were not read. */
  get waiting(): number {
    return this.#to - this.#from
  }

  exactly(count: number): Promise<Buffer> {
    if (this.waiting >= count) return Promise.resolve(this.#cut(count))
    if (this.#gone) return Promise.reject(new Gone('the other side closed the connection'))
    this.#socket.resume()
    return new Promise((resolve, reject) => {
      this.#wanted = { count, resolve, reject }
    })
  }

  /** The next typed frame; throws Breach where its length is beyond `ceiling` bytes or its type is not among `types`. */
  async frame(ceiling: number, types: string): Promise<Frame> {
    const header = await this.exactly(5)
    const type = String.fromCharCode(header.readUInt8(0))
    const length = header.readInt32BE(1)
    if (!types.includes(type)) throw new Breach('08P01', `unexpected message type 0x${header.toString('hex', 0, 1)}`)
    if (length < 4 || length > ceiling) throw new Breach('08P01', `invalid message length ${length} (the most is ${ceiling})`)
    return { type, body: await this.exactly(length - 4) }
  }

  /** Leaves the socket, paused, and hands over what was not read. */
  leave(): Buffer {
    this.#socket.off('data', this.#take)
    this.#socket.off('end', this.#close)
    this.#socket.off('close', this.#close)
    this.#socket.pause()
    return this.#cut(this.waiting)
  }

  readonly #take = (chunk: Buffer): void => {
    if (this.#to + chunk.length > this.#buffer.length) {
      const roomier = this.waiting + chunk.length > this.#buffer.length ? Buffer.allocUnsafe((this.waiting + chunk.length) * 2) : this.#buffer
      this.#buffer.copy(roomier, 0, this.#from, this.#to)
      this.#buffer = roomier
      this.#to -= this.#from
      this.#from = 0
    }
    this.#to += chunk.copy(this.#buffer, this.#to)
    const wanted = this.#wanted
    if (wanted !== null && this.waiting >= wanted.count) {
      this.#wanted = null
      wanted.resolve(this.#cut(wanted.count))
    }
    if (this.#wanted === null && this.waiting > this.#readAhead) this.#socket.pause()
  }

  readonly #close = (): void => {
    this.#gone = true
    this.#wanted?.reject(new Gone('the other side closed the connection'))
    this.#wanted = null
  }

  #cut(count: number): Buffer {
    const bytes = Buffer.from(this.#buffer.subarray(this.#from, this.#from + count))
    this.#from += count
    if (this.#from === this.#to) {
      this.#from = 0
      this.#to = 0
      if (this.#buffer.length > this.#readAhead) this.#buffer = Buffer.allocUnsafe(smallest)
    }
    return bytes
  }
}
