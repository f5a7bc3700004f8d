/** The edges as the pipeline meets them. */

/** What a column of a described text is: its name and its type as format_type prints it (with modifier). */
export interface DescribedColumn {
  readonly name: string
  readonly type: string
}

export type Described =
  | { readonly kind: 'described'; readonly parameters: readonly string[]; readonly columns: readonly DescribedColumn[] }
  /** PostgreSQL's own complaint about the text (analysis against the shells). */
  | { readonly kind: 'complaint'; readonly sqlstate: string; readonly message: string; readonly position: number | null }

/** Hedgerow's own way into the lobby, never an analyst's session. */
export interface Lobby {
  /** Parse and Describe only, nothing executed; `parameterTypes` are type oids, 0 where the client left them open. */
  describe(dataSet: string, text: string, parameterTypes: readonly number[]): Promise<Described>
  /**
   * Rows of a query over published data, read-only, every value as text. `ceiling` rows at the most: one more and the reply is 'too-many'.
   * `timeZone` is set for the transaction.
   */
  published(
    dataSet: string,
    text: string,
    values: readonly (string | null)[],
    timeZone: string,
    ceiling: number,
  ): Promise<readonly (readonly (string | null)[])[] | 'too-many'>
}

/** One call of the lobby's hedgerow.* functions over the pull port: untrusted text under a session_user the lobby vouches for. */
export interface PullRequest {
  readonly kind: 'release' | 'explain' | 'budget' | 'charges' | 'last_answer' | 'bounds'
  readonly pid: number
  readonly user: string
  readonly database: string
  /** release: a block's own text; explain: a statement's text; '' otherwise. */
  readonly text: string
  /** As jsonb_build_array made them: numbers arrive as text. */
  readonly args: readonly (string | boolean | null)[]
  /** Texts of the blocks of the same statement, itself included; [] when called by hand. */
  readonly siblings: readonly string[]
  /** hedgerow.* settings of the session, by name without the prefix; absent where never set. */
  readonly settings: Readonly<Record<string, string>>
  readonly timeZone: string
  /** transaction_timestamp() and statement_timestamp() of the session, ISO 8601 with offset. */
  readonly now: string
  readonly statement: string
  readonly application: string
}

export type PullReply =
  /** Row objects c1, c2, … with text, boolean or null values; `notice` is raised by the function. */
  | { readonly kind: 'rows'; readonly rows: readonly Readonly<Record<string, string | boolean | null>>[]; readonly notice: string }
  | { readonly kind: 'error'; readonly sqlstate: string; readonly message: string; readonly hint: string }

/** Answers one pull. Never throws; stops the vault's query when `signal` aborts. */
export interface AnswerPull {
  (request: PullRequest, signal: AbortSignal): Promise<PullReply>
}

export interface GateRefusal {
  readonly sqlstate: string
  readonly message: string
  readonly hint: string
  /** Character (1-based) in the text as the client sent it, 0 where there is none. */
  readonly position: number
}

export type GateVerdict =
  | { readonly kind: 'untouched' }
  /**
   * The text to send instead. A refused statement in it is a call of a function that does not exist, named by `marker`; the lobby's 42883 that
   * names the marker is swapped for the refusal.
   */
  | { readonly kind: 'rewritten'; readonly text: string; readonly refusals: readonly { readonly marker: string; readonly refusal: GateRefusal }[] }

export interface GateRequest {
  readonly user: string
  readonly database: string
  readonly text: string
  /** From Parse; [] for a simple Query. */
  readonly parameterTypes: readonly number[]
  readonly standardConformingStrings: boolean
}

/** What the wire asks before a text goes on. */
export interface Gate {
  /** Whether the (user, database) pair is an analyst's. */
  admits(user: string, database: string): boolean
  /** Cheap and on raw bytes: whether the text may name a private table (or an EXPLAIN of one). False: the bytes go on untouched, unparsed. */
  mentions(database: string, text: Uint8Array): boolean
  judge(request: GateRequest): Promise<GateVerdict>
}
