import type { Socket } from 'node:net'
import { readFields } from './error-frame.ts'
import { Framer, type Piece, type Treatment } from './frames.ts'
import { readParameterStatus } from './messages.ts'
import { Outlet } from './outlet.ts'
import { reworded } from './replies.ts'
import type { SessionFacts } from './session-facts.ts'

/** An error or notice longer than this streams through as it is. */
const longestComplaint = 1_048_576
/** Authentication requests, parameters, keys. */
const longestFact = 65_536

/** What the session does on what the lobby says. */
export interface DownstreamEvents {
  /** The lobby asks for something else than SCRAM. */
  readonly withoutScram: (request: number) => void
  /** The lobby turned the log-in away as one with a wrong password. */
  readonly wrongPassword: () => void
  readonly opened: () => void
  readonly ready: () => void
  readonly broken: () => void
}

/** The way from lobby to client. Frames stream through unread, but for the few that tell the session's state and for errors and notices. */
export class Downstream {
  readonly #lobby: Socket
  readonly #facts: SessionFacts
  readonly #events: DownstreamEvents
  readonly #outlet: Outlet
  readonly #framer = new Framer((type, length) => this.#treat(type, length))
  #scram: 'none' | 'asked' | 'proved' = 'none'
  #stopped = false

  constructor(lobby: Socket, client: Socket, facts: SessionFacts, events: DownstreamEvents) {
    this.#lobby = lobby
    this.#facts = facts
    this.#events = events
    this.#outlet = new Outlet(client)
    client.on('drain', () => lobby.resume())
  }

  /** Whether the client has whole frames only, so that one of ours may follow. */
  get between(): boolean {
    return this.#framer.between
  }

  take(chunk: Buffer): void {
    for (const piece of this.#framer.read(chunk)) {
      if (this.#stopped) return
      this.#piece(piece)
    }
    this.#outlet.flush()
    if (this.#outlet.full) this.#lobby.pause()
  }

  /** Sends what was let through, and nothing after it. */
  stop(): void {
    this.#outlet.flush()
    this.#stopped = true
  }

  #treat(type: number, length: number): Treatment {
    switch (type) {
      case 0x45: // E
      case 0x4e: // N
        return length <= longestComplaint ? 'hold' : 'pass'
      case 0x52: // R
      case 0x53: // S
      case 0x4b: // K
      case 0x5a: // Z
        return length <= longestFact ? 'hold' : 'refuse'
      case 0x47: // G
        this.#facts.pipeline.copyIn()
        return 'pass'
      default:
        return 'pass'
    }
  }

  #piece(piece: Piece): void {
    switch (piece.kind) {
      case 'bytes':
        return this.#outlet.write(piece.bytes)
      case 'broken':
        return this.#events.broken()
      case 'frame':
        return this.#frame(String.fromCharCode(piece.type), piece.bytes)
    }
  }

  #frame(type: string, bytes: Buffer): void {
    const facts = this.#facts
    switch (type) {
      case 'R':
        return this.#authentication(bytes)
      case 'E':
        return this.#error(bytes)
      case 'N':
        return this.#outlet.write(reworded(bytes, facts.pipeline, facts.clientEncoding))
      case 'S': {
        const [name, value] = readParameterStatus(bytes)
        if (name === 'client_encoding') facts.clientEncoding = value
        if (name === 'standard_conforming_strings') facts.standardConformingStrings = value === 'on'
        return this.#outlet.write(bytes)
      }
      case 'K':
        if (bytes.length >= 13) facts.backendKey = Buffer.from(bytes.subarray(5))
        this.#outlet.write(bytes)
        return this.#events.opened()
      case 'Z':
        if (facts.started) facts.pipeline.ready()
        facts.started = true
        facts.transaction = bytes.toString('latin1', 5, 6)
        this.#outlet.write(bytes)
        return this.#events.ready()
    }
  }

  #authentication(bytes: Buffer): void {
    const request = bytes.length >= 9 ? bytes.readUInt32BE(5) : -1
    if (request === 10 && this.#scram === 'none') this.#scram = 'asked'
    else if (request === 12 && this.#scram === 'asked') this.#scram = 'proved'
    else if (request === 0 && this.#scram === 'proved') this.#facts.phase = 'open'
    else if (request !== 11 || this.#scram !== 'asked') return this.#events.withoutScram(request)
    this.#outlet.write(bytes)
  }

  #error(bytes: Buffer): void {
    const facts = this.#facts
    const fields = facts.phase === 'log-in' ? readFields(bytes) : null
    if (fields?.some(([letter, value]) => letter === 'C' && value === '28P01') === true) return this.#events.wrongPassword()
    const reply = reworded(bytes, facts.pipeline, facts.clientEncoding)
    if (bytes.includes('VFATAL\0') || bytes.includes('VPANIC\0')) facts.ended = true
    this.#outlet.write(reply)
  }
}
