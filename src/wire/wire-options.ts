import type { Gate } from '../answer/ports.ts'
import type { Log } from '../base/ports.ts'
import type { LobbyAddress } from './lobby-link.ts'
import type { ScramSalt } from './scram.ts'
import type { MessageCeilings } from './upstream.ts'

/** How much the wire takes. */
export interface WireCeilings extends MessageCeilings {
  readonly connections: number
  readonly connectionsPerAddress: number
}

/** What suits a lobby of the usual hundred connections. */
export const wireCeilings: WireCeilings = {
  beforeLogin: 10_000,
  statement: 16_777_216,
  message: 67_108_864,
  connections: 200,
  connectionsPerAddress: 200,
}

/** What `serveClients` works with. */
export interface WireOptions {
  readonly host: string
  /** 0 takes any free one. */
  readonly port: number
  readonly lobby: LobbyAddress
  /** PEM texts; null: clients that ask for TLS are told no. */
  readonly tls: { readonly cert: string; readonly key: string } | null
  readonly gate: Gate
  readonly log: Log
  readonly ceilings: WireCeilings
  readonly loginTimeoutMs: number
  /** How long `close` waits for statements and transactions under way. */
  readonly drainMs: number
  /**
   * The salt of a known analyst's log-in, which the decoy of an unknown database shows as well; null where nothing is known. Without it an
   * analyst's name can be told from the salts of two databases.
   */
  readonly saltOf?: (user: string) => ScramSalt | null
  /** Salts of unknown users come from this: keep it, and they stay the same over a restart. */
  readonly decoySecret?: Uint8Array
}
