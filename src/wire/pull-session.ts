import { timingSafeEqual } from 'node:crypto'
import type { Socket } from 'node:net'
import { Failure } from '../base/failure.ts'
import { unreachable } from '../base/check.ts'
import type { Log } from '../base/ports.ts'
import type { AnswerPull, PullRequest } from '../answer/ports.ts'
import { Breach } from './breach.ts'
import type { ByteReader, Frame } from './byte-reader.ts'
import { complaintFrame } from './error-frame.ts'
import { cString, frame, int16, int32, readyForQuery } from './messages.ts'
import { readPull } from './pull-message.ts'

const textOid = 25
const rowDescription = frame('T', int16(1), cString('reply'), int32(0), int16(0), int32(textOid), int16(-1), int32(-1), int16(0))

/** One connection of the lobby after log-in: it asks, and is answered, one query at a time. */
export class PullSession {
  readonly pid: number
  readonly #key: Buffer
  readonly #socket: Socket
  readonly #reader: ByteReader
  readonly #answer: AnswerPull
  readonly #log: Log
  readonly #ceiling: number
  #running: AbortController | null = null
  #answering: Promise<unknown> = Promise.resolve()

  /** `key`: process number and cancel key; `ceiling`: bytes of a message. */
  constructor(socket: Socket, reader: ByteReader, key: Buffer, answer: AnswerPull, log: Log, ceiling: number) {
    this.pid = key.readUInt32BE(0)
    this.#key = key.subarray(4)
    this.#socket = socket
    this.#reader = reader
    this.#answer = answer
    this.#log = log
    this.#ceiling = ceiling
  }

  /** Ends when the lobby says Terminate; rejects with Gone when it closes, with Breach when it breaks the protocol. */
  async run(): Promise<void> {
    let next = this.#next()
    for (;;) {
      const message = await next
      if (message.type === 'X') return
      // The next message is read while this one is answered: that is how the end of the connection is seen.
      const running = new AbortController()
      this.#running = running
      next = this.#next()
      void next.then(
        ({ type }) => {
          if (type === 'X') running.abort()
        },
        () => running.abort(),
      )
      const reply = await this.#reply(message, running.signal)
      this.#running = null
      if (!this.#socket.destroyed) this.#socket.write(Buffer.concat([...reply, readyForQuery('I')]))
    }
  }

  /** A CancelRequest names this connection; nothing happens unless the key is right. */
  cancel(key: Buffer): void {
    if (key.length === this.#key.length && timingSafeEqual(key, this.#key)) this.#running?.abort()
  }

  #next(): Promise<Frame> {
    return this.#reader.frame(this.#ceiling, 'QX')
  }

  async #reply({ body }: Frame, signal: AbortSignal): Promise<readonly Buffer[]> {
    if (body.indexOf(0) !== body.length - 1) throw new Breach('08P01', 'invalid message format')
    const message = readPull(body.toString('utf8', 0, body.length - 1))
    switch (message.kind) {
      case 'empty':
        return [frame('I')]
      case 'setting':
        return [frame('C', cString(message.command))]
      case 'unreadable':
        this.#log('warn', 'pull.unreadable', { pid: this.pid })
        return [complaintFrame({ severity: 'ERROR', sqlstate: '42601', message: message.message })]
      case 'pull':
        return this.#pull(message.request, signal)
      default:
        return unreachable(message)
    }
  }

  async #pull(request: PullRequest, signal: AbortSignal): Promise<readonly Buffer[]> {
    await this.#answering
    if (signal.aborted) return [canceled]
    const answering = this.#answer(request, signal)
    this.#answering = answering.catch(() => undefined)
    let stop = () => undefined as void
    const aborted = new Promise<'aborted'>((resolve) => {
      stop = () => resolve('aborted')
      signal.addEventListener('abort', stop, { once: true })
    })
    try {
      const reply = await Promise.race([answering, aborted])
      if (reply === 'aborted') return [canceled]
      const json = Buffer.from(JSON.stringify(reply), 'utf8')
      return [rowDescription, frame('D', int16(1), int32(json.length), json), frame('C', cString('SELECT 1'))]
    } catch (error) {
      const failure = error instanceof Failure ? error : new Failure('internal')
      this.#log('error', 'pull.answer_failed', { reference: failure.reference, fault: error instanceof Error ? error.name : 'unknown' })
      return [complaintFrame({ severity: 'ERROR', sqlstate: 'XX000', message: `the answer failed (reference ${failure.reference})` })]
    } finally {
      signal.removeEventListener('abort', stop)
    }
  }
}

const canceled = complaintFrame({ severity: 'ERROR', sqlstate: '57014', message: 'canceling statement due to user request' })
