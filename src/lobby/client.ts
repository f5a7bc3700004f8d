import pg from 'pg'
import type { Described, Lobby } from '../answer/ports.ts'
import { describeOn, type RawDescription } from './describe.ts'
import { openSession, urlOf, type TextRow } from './session.ts'

export interface LobbyAddress {
  readonly lobbyUrl: string
  /** How many connections of Hedgerow's own a data set's database bears. */
  readonly connections?: number
  readonly statementTimeoutMs?: number
}

export interface LobbyClient extends Lobby {
  close(): Promise<void>
}

/** Hedgerow's own connections to the lobby, a few for each data set, opened when first needed and kept. */
export function connectLobby(address: LobbyAddress): LobbyClient {
  const pools = new Map<string, DataSetPool>()
  const timeoutMs = address.statementTimeoutMs ?? 30_000
  const poolOf = (dataSet: string): DataSetPool => {
    const known = pools.get(dataSet)
    if (known !== undefined) return known
    const made = new DataSetPool(urlOf(address.lobbyUrl, dataSet), address.connections ?? 4, timeoutMs)
    pools.set(dataSet, made)
    return made
  }
  return {
    describe: (dataSet, text, parameterTypes) => poolOf(dataSet).use((client) => describe(client, poolOf(dataSet), text, parameterTypes)),
    published: (dataSet, text, values, timeZone, ceiling) => poolOf(dataSet).use((client) => readPublished(client, text, values, timeZone, ceiling)),
    close: async () => {
      await Promise.all([...pools.values()].map((pool) => pool.close()))
      pools.clear()
    },
  }
}

/** Connections in which Hedgerow sees what an analyst of the data set sees, under the role hedgerow_reader. */
class DataSetPool {
  readonly #url: string
  readonly #size: number
  readonly #timeoutMs: number
  readonly #idle: pg.Client[] = []
  readonly #waiting: (() => void)[] = []
  /** Printed types by `oid,modifier`. */
  readonly types = new Map<string, string>()
  #used = 0
  #closed = false
  constructor(url: string, size: number, timeoutMs: number) {
    this.#url = url
    this.#size = size
    this.#timeoutMs = timeoutMs
  }
  async use<T>(work: (client: pg.Client) => Promise<T>): Promise<T> {
    while (this.#used >= this.#size) await new Promise<void>((resolve) => this.#waiting.push(resolve))
    this.#used += 1
    let client: pg.Client | undefined
    try {
      client = this.#idle.pop() ?? (await this.#open())
      const value = await work(client)
      if (this.#closed) await client.end().catch(() => undefined)
      else this.#idle.push(client)
      return value
    } catch (error) {
      await client?.end().catch(() => undefined)
      throw error
    } finally {
      this.#used -= 1
      this.#waiting.shift()?.()
    }
  }
  async close(): Promise<void> {
    this.#closed = true
    await Promise.all(this.#idle.splice(0).map((client) => client.end().catch(() => undefined)))
  }
  async #open(): Promise<pg.Client> {
    const client = await openSession(this.#url, {
      statement_timeout: String(this.#timeoutMs),
      row_security: 'on',
      client_min_messages: 'error',
      DateStyle: 'ISO, MDY',
      IntervalStyle: 'postgres',
      extra_float_digits: '1',
      role: 'hedgerow_reader',
    })
    client.on('end', () => {
      const at = this.#idle.indexOf(client)
      if (at >= 0) this.#idle.splice(at, 1)
    })
    return client
  }
}

async function describe(client: pg.Client, pool: DataSetPool, text: string, parameterTypes: readonly number[]): Promise<Described> {
  let raw: RawDescription
  try {
    raw = await describeOn(client, text, parameterTypes)
  } catch (error) {
    if (!(error instanceof pg.DatabaseError) || isConnectionLost(error.code ?? '')) throw error
    const position = Number(error.position ?? '0')
    return { kind: 'complaint', sqlstate: error.code ?? 'XX000', message: error.message, position: position > 0 ? position : null }
  }
  const wanted = [...raw.parameters.map((oid) => ({ oid, modifier: -1 })), ...raw.columns]
  await learnTypes(client, pool, wanted)
  return {
    kind: 'described',
    parameters: raw.parameters.map((oid) => pool.types.get(`${oid},-1`) ?? 'unknown'),
    columns: raw.columns.map((column) => ({ name: column.name, type: pool.types.get(`${column.oid},${column.modifier}`) ?? 'unknown' })),
  }
}

/** 57P0x: the server ended the session; 08: the connection broke. Not a complaint about the text. */
function isConnectionLost(sqlstate: string): boolean {
  return sqlstate.startsWith('57P') || sqlstate.startsWith('08')
}

/** A type made anew by a policy load has a new oid, so what was learnt stays true. */
async function learnTypes(client: pg.Client, pool: DataSetPool, wanted: readonly { readonly oid: number; readonly modifier: number }[]): Promise<void> {
  const missing = new Map(
    wanted.map((type) => [`${type.oid},${type.modifier}`, type]).filter(([key]) => !pool.types.has(key as string)) as [
      string,
      { oid: number; modifier: number },
    ][],
  )
  if (missing.size === 0) return
  const list = [...missing.values()].map((type) => `(${type.oid}, ${type.modifier})`).join(', ')
  // With an empty search path format_type prints every type that is not PostgreSQL's own with its schema.
  const results = (await client.query({
    text: `BEGIN; SET LOCAL search_path = ''; SELECT t.o, t.m, pg_catalog.format_type(t.o::oid, t.m) FROM (VALUES ${list}) AS t(o, m); COMMIT`,
    rowMode: 'array',
  })) as unknown as readonly { readonly rows: readonly TextRow[] }[]
  for (const [oid, modifier, printed] of results[2]?.rows ?? []) pool.types.set(`${oid},${modifier}`, printed ?? '')
}

async function readPublished(
  client: pg.Client,
  text: string,
  values: readonly (string | null)[],
  timeZone: string,
  ceiling: number,
): Promise<readonly TextRow[] | 'too-many'> {
  await client.query('BEGIN READ ONLY')
  try {
    await client.query('SELECT pg_catalog.set_config($1, $2, true)', ['TimeZone', timeZone])
    await client.query({ text: `DECLARE published NO SCROLL CURSOR FOR ${text}`, values: [...values] })
    const rows = (await client.query<(string | null)[]>({ text: `FETCH FORWARD ${ceiling + 1} FROM published`, rowMode: 'array' })).rows
    return rows.length > ceiling ? 'too-many' : rows
  } finally {
    // Where this fails the connection is lost, and with it the transaction.
    await client.query('ROLLBACK').catch(() => undefined)
  }
}
