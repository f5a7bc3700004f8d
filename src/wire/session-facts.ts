import { Pipeline } from './pipeline.ts'

/** What a session's two directions know of each other. */
export class SessionFacts {
  readonly user: string
  readonly database: string
  readonly pipeline = new Pipeline()
  /** 'log-in' until the lobby has said AuthenticationOk, 'open' from then on. */
  phase: 'log-in' | 'open' = 'log-in'
  /** A ReadyForQuery has come. */
  started = false
  clientEncoding = 'UTF8'
  standardConformingStrings = true
  /** Process number and cancel key, as BackendKeyData has them. */
  backendKey: Buffer | null = null
  /** I idle, T in a transaction, E in an aborted one. */
  transaction = 'I'
  /** The client has said Terminate. */
  terminated = false
  /** The lobby has said a FATAL error, or we have. */
  ended = false

  constructor(user: string, database: string) {
    this.user = user
    this.database = database
  }

  get pid(): number | null {
    return this.backendKey?.readUInt32BE(0) ?? null
  }

  /** Nothing is under way and no transaction is open. */
  get idle(): boolean {
    return this.started && this.transaction === 'I' && this.pipeline.idle
  }
}
