import type { Socket } from 'node:net'
import type { Log } from '../base/ports.ts'
import type { Gate } from '../answer/ports.ts'
import { Breach } from './breach.ts'
import { Downstream } from './downstream.ts'
import { complaintFrame } from './error-frame.ts'
import { farewell } from './farewell.ts'
import { cancelAtLobby, dropLobby, type LobbyAddress } from './lobby-link.ts'
import { int32 } from './messages.ts'
import { wrongPassword } from './scram-login.ts'
import { SessionFacts } from './session-facts.ts'
import { cancelRequest } from './startup.ts'
import { Upstream, type MessageCeilings } from './upstream.ts'

/** One analyst's session as the rest of the program sees it. */
export interface Session {
  /** The lobby backend's process number. */
  readonly pid: number
  readonly user: string
  readonly database: string
  readonly address: string
  /** Neither a statement nor a transaction is under way. */
  readonly idle: boolean
  /** Ends the session with a FATAL error; a running statement is cancelled. */
  end(sqlstate: string, message: string): void
}

export interface RelayParts {
  readonly client: Socket
  readonly lobby: Socket
  readonly lobbyAddress: LobbyAddress
  readonly user: string
  readonly database: string
  readonly address: string
  readonly gate: Gate
  readonly log: Log
  readonly ceilings: MessageCeilings
  readonly loginTimeoutMs: number
  /** The lobby gave the session its process number. */
  readonly onOpen: (session: Session) => void
  /** A statement or the log-in is done. */
  readonly onReady: (session: Session) => void
}

const lobbyFarewellMs = 2_000

/** Joins a client and a lobby connection to which the StartupMessage was sent; `early` are bytes of the client that came with it. Resolves when both are gone. */
export function relay(parts: RelayParts, early: Buffer): Promise<void> {
  return new Promise((resolve) => {
    new Relay(parts, resolve).begin(early)
  })
}

class Relay implements Session {
  readonly #parts: RelayParts
  readonly #facts: SessionFacts
  readonly #upstream: Upstream
  readonly #downstream: Downstream
  readonly #loginTimer: NodeJS.Timeout
  readonly #finished: () => void
  #over = false

  constructor(parts: RelayParts, finished: () => void) {
    const { client, lobby, gate, log } = parts
    this.#parts = parts
    this.#finished = finished
    this.#facts = new SessionFacts(parts.user, parts.database)
    this.#upstream = new Upstream(client, lobby, this.#facts, gate, log, parts.ceilings, (breach) => this.#breach(breach))
    this.#downstream = new Downstream(lobby, client, this.#facts, {
      withoutScram: (request) => this.#withoutScram(request),
      wrongPassword: () => this.#wrongPassword(),
      opened: () => parts.onOpen(this),
      ready: () => this.#ready(),
      broken: () => this.#brokenLobby(),
    })
    this.#loginTimer = setTimeout(() => this.end('08P01', 'canceling authentication due to timeout'), parts.loginTimeoutMs)
  }

  get pid(): number {
    return this.#facts.pid ?? 0
  }

  get user(): string {
    return this.#parts.user
  }

  get database(): string {
    return this.#parts.database
  }

  get address(): string {
    return this.#parts.address
  }

  get idle(): boolean {
    return this.#facts.idle
  }

  begin(early: Buffer): void {
    const { client, lobby } = this.#parts
    lobby.on('data', (chunk: Buffer) => this.#downstream.take(chunk))
    lobby.on('end', () => this.#lobbyGone())
    lobby.on('close', () => this.#lobbyGone())
    client.on('end', () => this.#clientGone())
    client.on('close', () => this.#clientGone())
    client.on('data', (chunk: Buffer) => this.#upstream.take(chunk))
    if (client.destroyed) return this.#clientGone()
    if (lobby.destroyed) return this.#lobbyGone()
    this.#upstream.take(early)
    lobby.resume()
    client.resume()
  }

  end(sqlstate: string, message: string): void {
    this.#breach(new Breach(sqlstate, message))
  }

  #ready(): void {
    clearTimeout(this.#loginTimer)
    this.#parts.onReady(this)
  }

  /** Tells the client why, where a frame may be sent, and ends both sides. */
  #breach(breach: Breach): void {
    if (this.#over) return
    const { client, log, user, database } = this.#parts
    if (breach.sqlstate !== '28P01') log('warn', 'wire.ended', { user, database, pid: this.#facts.pid, sqlstate: breach.sqlstate })
    this.#close()
    this.#downstream.stop()
    if (this.#downstream.between && !this.#facts.ended) {
      farewell(client, complaintFrame({ severity: 'FATAL', sqlstate: breach.sqlstate, message: breach.message, detail: breach.detail }))
    } else client.destroy()
    this.#dropLobby()
    this.#finished()
  }

  #wrongPassword(): void {
    const { user, log, database, address } = this.#parts
    log('warn', 'wire.login_failed', { user, database, address })
    this.#breach(wrongPassword(user))
  }

  #withoutScram(request: number): void {
    this.#parts.log('error', 'wire.lobby_without_scram', { user: this.#parts.user, database: this.#parts.database, request })
    this.#breach(
      new Breach(
        '28000',
        'the lobby does not authenticate analysts by SCRAM',
        'Its pg_hba.conf must say scram-sha-256 for connections from Hedgerow; whoever runs it can put that right.',
      ),
    )
  }

  #brokenLobby(): void {
    this.#parts.log('error', 'wire.lobby_frames', { pid: this.#facts.pid })
    this.#breach(new Breach('08P01', 'the lobby sent a message that cannot be'))
  }

  #clientGone(): void {
    if (this.#over) return
    this.#close()
    const { client, lobby } = this.#parts
    client.destroy()
    if (this.#facts.terminated && this.#facts.pipeline.idle && !lobby.destroyed) {
      // Terminate is on its way and nothing runs: the backend leaves by itself.
      lobby.end()
      const timer = setTimeout(() => lobby.destroy(), lobbyFarewellMs)
      lobby.once('close', () => clearTimeout(timer))
      lobby.resume()
    } else this.#dropLobby()
    this.#finished()
  }

  #lobbyGone(): void {
    if (this.#over) return
    const { client, log, lobby, user, database } = this.#parts
    const expected = this.#facts.terminated || this.#facts.ended
    this.#close()
    lobby.destroy()
    if (!expected) log('warn', 'wire.lobby_lost', { user, database, pid: this.#facts.pid })
    if (expected) farewell(client, null)
    else if (this.#downstream.between)
      farewell(client, complaintFrame({ severity: 'FATAL', sqlstate: '08006', message: 'the connection to the lobby was lost' }))
    else client.destroy()
    this.#finished()
  }

  #close(): void {
    this.#over = true
    clearTimeout(this.#loginTimer)
    this.#upstream.stop()
  }

  /** The socket goes first: a backend that is then cancelled finds nobody to go on for. */
  #dropLobby(): void {
    const { lobby, lobbyAddress } = this.#parts
    const { backendKey, pipeline } = this.#facts
    dropLobby(lobby, lobbyAddress)
    if (backendKey === null || pipeline.idle) return
    void cancelAtLobby(lobbyAddress, Buffer.concat([int32(12 + backendKey.length - 4), int32(cancelRequest), backendKey]))
  }
}
