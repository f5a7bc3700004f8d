import type { GateRefusal } from '../answer/ports.ts'

/** What the client sent up to one Query, FunctionCall or Sync: the lobby answers it with one ReadyForQuery. */
interface Unit {
  extended: boolean
  /** Something in it was rewritten by us. */
  rewritten: boolean
  parses: number
  /** Messages that the lobby has to act on. */
  messages: number
  markers: string[]
  copyStarted: boolean
  copyEnded: boolean
}

const fresh = (): Unit => ({ extended: true, rewritten: false, parses: 0, messages: 0, markers: [], copyStarted: false, copyEnded: false })

/**
 * Follows which of the client's messages the lobby has not finished with, from message types alone. It decides how an error is worded and whether a
 * session is idle, never what is sent: where the two sides race (a Sync that a COPY swallowed) it errs towards busy.
 */
export class Pipeline {
  #closed: Unit[] = []
  #open = fresh()
  #refusals = new Map<string, GateRefusal>()
  #preparedRewritten = false

  /** Whether the lobby has answered everything it was sent. */
  get idle(): boolean {
    return this.#closed.length === 0 && this.#open.messages === 0
  }

  /** A Query or Parse goes on; `refusals` are those its new text stands for. */
  statement(type: 'Q' | 'P', rewritten: boolean, refusals: readonly { readonly marker: string; readonly refusal: GateRefusal }[]): void {
    const unit = this.#open
    unit.rewritten ||= rewritten
    for (const { marker, refusal } of refusals) {
      unit.markers.push(marker)
      this.#refusals.set(marker, refusal)
    }
    if (type === 'P') {
      unit.parses += 1
      unit.messages += 1
      this.#preparedRewritten ||= rewritten
    } else this.#close(false)
  }

  /** A message of another type goes on. */
  sent(type: string): void {
    switch (type) {
      case 'S':
        return this.#close(true)
      case 'F':
        return this.#close(false)
      case 'c':
      case 'f':
        this.#open.copyEnded = true
        return
      case 'd':
      case 'H':
        return
      default:
        this.#open.messages += 1
    }
  }

  /** The lobby waits for COPY data. */
  copyIn(): void {
    this.#head.copyStarted = true
  }

  ready(): void {
    const unit = this.#closed.shift()
    if (unit === undefined) return
    this.#forget(unit)
    if (!unit.extended || !unit.copyStarted || unit.copyEnded) return
    // The Sync of this unit came while the lobby took COPY data, and was ignored; the one after the data was answered.
    for (let next = this.#closed.shift(); next !== undefined; next = this.#closed.shift()) {
      this.#forget(next)
      if (next.copyEnded) return
    }
  }

  /** The refusal that stands behind an undefined function named in `message`. */
  refusalIn(message: string): GateRefusal | null {
    for (const [marker, refusal] of this.#refusals) if (message.includes(marker)) return refusal
    return null
  }

  /** Whether a position in an error of now may count characters of a text of ours. */
  get positionIsOurs(): boolean {
    const head = this.#head
    return head.rewritten || (this.#preparedRewritten && head.extended && head.parses === 0)
  }

  get #head(): Unit {
    return this.#closed[0] ?? this.#open
  }

  #close(extended: boolean): void {
    this.#open.extended = extended
    this.#closed.push(this.#open)
    this.#open = fresh()
  }

  #forget(unit: Unit): void {
    for (const marker of unit.markers) this.#refusals.delete(marker)
  }
}
