import type pg from 'pg'

/** What `pg` offers a query of one's own; its published types leave it out. */
interface Wire {
  readonly stream: NodeJS.ReadWriteStream & { readonly writableNeedDrain: boolean }
  query(text: string): void
  sendCopyFromChunk(chunk: Uint8Array): void
  endCopyFrom(): void
  sendCopyFail(message: string): void
}

const batchBytes = 65_536

/** COPY … TO STDOUT on one connection becomes COPY … FROM STDIN on the other, with the sockets' buffers in between at most. Both texts must name text format. */
export async function copyThrough(from: pg.Client, fromText: string, to: pg.Client, toText: string): Promise<void> {
  const target = new CopyIn(toText)
  to.query(target as unknown as pg.Submittable)
  await Promise.race([target.ready, target.done])
  const source = new CopyOut(fromText, target)
  from.query(source as unknown as pg.Submittable)
  try {
    await source.done
  } catch (error) {
    target.fail()
    await target.done.catch(() => undefined)
    throw error
  }
  target.finish()
  await target.done
}

class CopyStep {
  readonly done: Promise<void>
  #resolve!: () => void
  #reject!: (error: unknown) => void
  #error: unknown = null
  constructor() {
    this.done = new Promise((resolve, reject) => {
      this.#resolve = resolve
      this.#reject = reject
    })
    this.done.catch(() => undefined)
  }
  handleError(error: unknown): void {
    this.#error ??= error
    this.ended()
    // A connection that broke sends no ReadyForQuery.
    this.#reject(error)
  }
  handleReadyForQuery(): void {
    this.ended()
    if (this.#error === null) this.#resolve()
    else this.#reject(this.#error)
  }
  handleCommandComplete(): void {}
  handleRowDescription(): void {}
  handleDataRow(): void {}
  handleEmptyQuery(): void {}
  handlePortalSuspended(): void {}
  handleCopyInResponse(_wire: Wire): void {}
  handleCopyData(_message: { readonly chunk: Uint8Array }, _wire: Wire): void {}
  protected ended(): void {}
}

class CopyIn extends CopyStep {
  readonly ready: Promise<void>
  readonly #text: string
  #begin!: () => void
  #wire: Wire | null = null
  /** Rows not sent yet: one message carries many of them. */
  #chunks: Uint8Array[] = []
  #size = 0
  #waiting = false
  constructor(text: string) {
    super()
    this.#text = text
    this.ready = new Promise((resolve) => {
      this.#begin = resolve
    })
  }
  submit(wire: Wire): void {
    wire.query(this.#text)
  }
  override handleCopyInResponse(wire: Wire): void {
    this.#wire = wire
    this.#begin()
  }
  /** True while more may come at once; else `resume` is called when it may. */
  write(chunk: Uint8Array, resume: () => void): boolean {
    // `chunk` is a view of the connection's read buffer, which is used again.
    this.#chunks.push(Uint8Array.from(chunk))
    this.#size += chunk.length
    if (this.#size < batchBytes) return true
    return this.#flush(resume)
  }
  finish(): void {
    this.#flush(() => undefined)
    this.#wire?.endCopyFrom()
  }
  #flush(resume: () => void): boolean {
    const wire = this.#wire
    if (wire !== null && this.#size > 0) wire.sendCopyFromChunk(Buffer.concat(this.#chunks))
    this.#chunks = []
    this.#size = 0
    if (wire === null || !wire.stream.writableNeedDrain) return true
    if (!this.#waiting)
      wire.stream.once('drain', () => {
        this.#waiting = false
        resume()
      })
    this.#waiting = true
    return false
  }
  fail(): void {
    this.#wire?.sendCopyFail('the source stopped')
  }
  protected override ended(): void {
    this.#wire = null
    this.#begin()
  }
}

class CopyOut extends CopyStep {
  readonly #text: string
  readonly #target: CopyIn
  #wire: Wire | null = null
  constructor(text: string, target: CopyIn) {
    super()
    this.#text = text
    this.#target = target
  }
  submit(wire: Wire): void {
    this.#wire = wire
    wire.query(this.#text)
  }
  override handleCopyData(message: { readonly chunk: Uint8Array }, wire: Wire): void {
    if (!this.#target.write(message.chunk, () => wire.stream.resume())) wire.stream.pause()
  }
  protected override ended(): void {
    this.#wire?.stream.resume()
  }
}
