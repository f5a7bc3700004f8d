import type { Socket } from 'node:net'
import type { Log } from '../base/ports.ts'
import type { Gate } from '../answer/ports.ts'
import { Breach } from './breach.ts'
import { Framer, type Piece, type Treatment } from './frames.ts'
import { Outlet } from './outlet.ts'
import type { SessionFacts } from './session-facts.ts'
import { judge, type Judged } from './statements.ts'

/** Bytes that may wait here while a statement is judged or the lobby is not reading; the client's socket is read up to that, so that its end is seen. */
const readAhead = 262_144

const inSession = 'QPBEDCHSFdcfX'

/** The longest messages of a client, in bytes. */
export interface MessageCeilings {
  /** Any message before log-in. */
  readonly beforeLogin: number
  /** Query and Parse, which are gathered before they go on. */
  readonly statement: number
  /** Any other message after log-in; these stream through. */
  readonly message: number
}

/** The way from client to lobby. A Query or Parse is judged before it goes on; whatever comes after it waits, in order. */
export class Upstream {
  readonly #client: Socket
  readonly #facts: SessionFacts
  readonly #gate: Gate
  readonly #log: Log
  readonly #outlet: Outlet
  readonly #framer: Framer
  readonly #onBreach: (breach: Breach) => void
  #chunks: Buffer[] = []
  #waiting = 0
  #pieces: Iterator<Piece, void> | null = null
  #judging = false
  #stopped = false

  constructor(client: Socket, lobby: Socket, facts: SessionFacts, gate: Gate, log: Log, ceilings: MessageCeilings, onBreach: (breach: Breach) => void) {
    this.#client = client
    this.#facts = facts
    this.#gate = gate
    this.#log = log
    this.#outlet = new Outlet(lobby)
    this.#framer = new Framer((type, length) => this.#treat(type, length, ceilings))
    this.#onBreach = onBreach
    lobby.on('drain', () => this.#pump())
  }

  take(chunk: Buffer): void {
    if (this.#stopped || chunk.length === 0) return
    this.#chunks.push(chunk)
    this.#waiting += chunk.length
    this.#pump()
  }

  stop(): void {
    this.#stopped = true
    this.#chunks = []
  }

  #pump(): void {
    while (!this.#judging && !this.#stopped && !this.#outlet.full) {
      const step = this.#pieces?.next()
      if (step !== undefined && step.done !== true) {
        this.#piece(step.value)
        continue
      }
      const chunk = this.#chunks.shift()
      this.#pieces = chunk === undefined ? null : this.#framer.read(chunk)
      if (chunk === undefined) break
      this.#waiting -= chunk.length
    }
    this.#outlet.flush()
    if (this.#stopped) return
    if (this.#waiting > readAhead) this.#client.pause()
    else this.#client.resume()
  }

  #treat(type: number, length: number, ceilings: MessageCeilings): Treatment {
    const letter = String.fromCharCode(type)
    if (this.#facts.phase === 'log-in') return letter === 'p' && length <= ceilings.beforeLogin ? 'pass' : 'refuse'
    if (this.#facts.terminated || !inSession.includes(letter)) return 'refuse'
    if (letter === 'Q' || letter === 'P') return length <= ceilings.statement ? 'hold' : 'refuse'
    if (length > ceilings.message) return 'refuse'
    if (letter === 'X') this.#facts.terminated = true
    else this.#facts.pipeline.sent(letter)
    return 'pass'
  }

  #piece(piece: Piece): void {
    switch (piece.kind) {
      case 'bytes':
        return this.#outlet.write(piece.bytes)
      case 'broken':
        return this.#broken(piece.type, piece.length)
      case 'frame': {
        const judged = judge(piece.bytes, this.#facts, this.#gate, this.#log)
        if (!(judged instanceof Promise)) return this.#forward(piece.type, judged)
        this.#judging = true
        void judged.then((verdict) => {
          this.#judging = false
          if (this.#stopped) return
          this.#forward(piece.type, verdict)
          this.#pump()
        })
      }
    }
  }

  #forward(type: number, judged: Judged): void {
    this.#facts.pipeline.statement(type === 0x51 ? 'Q' : 'P', judged.rewritten, judged.refusals)
    this.#outlet.write(judged.bytes)
  }

  #broken(type: number, length: number): void {
    if (this.#facts.terminated) return this.stop()
    const letter = String.fromCharCode(type)
    const expected = this.#facts.phase === 'log-in' ? 'p' : inSession
    if (!expected.includes(letter)) {
      const message = this.#facts.phase === 'log-in' ? `expected SASL response, got message type ${type}` : `invalid frontend message type ${type}`
      this.#onBreach(new Breach('08P01', message))
    } else if (length < 4) this.#onBreach(new Breach('08P01', `invalid message length ${length}`))
    else this.#onBreach(new Breach(letter === 'Q' || letter === 'P' ? '54000' : '08P01', `a message of type ${letter} may not be ${length} bytes long here`))
  }
}
