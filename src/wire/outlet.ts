import type { Socket } from 'node:net'

/** Writes to a socket what lies together in one piece, in one go for each chunk that came in. */
export class Outlet {
  readonly #socket: Socket
  #run: Buffer | null = null
  #corked = false

  constructor(socket: Socket) {
    this.#socket = socket
  }

  /** The socket has enough for now. */
  get full(): boolean {
    return this.#socket.writableNeedDrain
  }

  write(bytes: Buffer): void {
    const run = this.#run
    if (run !== null && run.buffer === bytes.buffer && run.byteOffset + run.length === bytes.byteOffset) {
      this.#run = Buffer.from(run.buffer, run.byteOffset, run.length + bytes.length)
      return
    }
    if (run !== null) {
      if (!this.#corked) this.#socket.cork()
      this.#corked = true
      this.#socket.write(run)
    }
    this.#run = bytes
  }

  flush(): void {
    if (this.#run !== null && this.#run.length > 0) this.#socket.write(this.#run)
    this.#run = null
    if (this.#corked) this.#socket.uncork()
    this.#corked = false
  }
}
