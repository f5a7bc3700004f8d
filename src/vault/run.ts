import type { Socket } from 'node:net'
import { Query } from 'pg'
import type { PoolClient } from 'pg'
import { BrokenCheck } from '../base/check.ts'
import { Failure } from '../base/failure.ts'
import type { BoundedQuery } from '../bound/bounded-query.ts'
import { exactRow, sealExact } from '../release/exact.ts'
import type { ExactRow, ExactTable } from '../release/exact.ts'
import { asText, giveBack } from './connections.ts'
import type { TextRow, VaultConnections } from './connections.ts'

export interface RunOptions {
  readonly timeZone: string
  readonly timeoutMs: number
  readonly workMemKb: number
  readonly rowCeiling: number
  readonly byteCeiling: number
  readonly noticesLostClients: boolean
}

export interface Running {
  readonly result: Promise<ExactTable>
  /** Stops the query in the vault and cuts its connection, at once and in whatever state it is. */
  cut(): void
}

/** Starts the query; the caller cuts it when it is no longer waited for, also after `result` rejected. */
export function runQuery(connections: VaultConnections, query: BoundedQuery, options: RunOptions): Running {
  let over = false
  let held: { readonly client: PoolClient; pid: string } | null = null

  const give = (whole: boolean): void => {
    if (held === null) return
    const { client, pid } = held
    held = null
    giveBack(client, whole)
    if (!whole && pid !== '') void connections.cancel(pid)
  }

  const begun = async (): Promise<PoolClient> => {
    const client = await connections.asking.connect()
    // No longer waited for: back it goes, unused.
    if (over) {
      giveBack(client, true)
      throw new Failure('vault')
    }
    const mine = { client, pid: '' }
    held = mine
    mine.pid = await begin(client, options)
    return client
  }

  const run = async (): Promise<ExactTable> => {
    const client = await begun().catch(async (error: unknown) => {
      if (over || !isLost(error)) throw error
      // The connection had died while it lay idle: the vault was restarted, and nothing was asked yet.
      give(false)
      return begun()
    })
    const rows = await readRows(client, query, options)
    if (!over) finish(client)
    return sealExact(rows)
  }

  const finish = (client: PoolClient): void => {
    held = null
    client.query('commit').then(
      () => giveBack(client, true),
      () => giveBack(client, false),
    )
  }

  return {
    result: run(),
    cut: () => {
      over = true
      give(false)
    },
  }
}

const settingsSql = `
  select pg_backend_pid(), set_config('timezone', $1, true), set_config('statement_timeout', $2, true), set_config('work_mem', $3, true),
         set_config('search_path', 'pg_catalog, pg_temp', true), set_config('datestyle', 'ISO', true), set_config('intervalstyle', 'postgres', true),
         set_config('extra_float_digits', '1', true), set_config('standard_conforming_strings', 'on', true), set_config('jit', 'off', true)`

async function begin(client: PoolClient, { timeZone, timeoutMs, workMemKb, noticesLostClients }: RunOptions): Promise<string> {
  const text = noticesLostClients ? `${settingsSql}, set_config('client_connection_check_interval', '500ms', true)` : settingsSql
  const values = [timeZone, `${timeoutMs}ms`, `${workMemKb}kB`]
  const [, { rows }] = await Promise.all([
    client.query('begin isolation level repeatable read read only'),
    client.query<string[]>({ text, values, rowMode: 'array', types: asText }),
  ])
  return rows[0]?.[0] ?? ''
}

/** Rows are turned into bigints one by one as they arrive: nothing else of the answer is kept. */
async function readRows(client: PoolClient, query: BoundedQuery, { rowCeiling, byteCeiling }: RunOptions): Promise<readonly ExactRow[]> {
  const { text, keyCount, totalCount } = query
  const socket = client.connection.stream as Socket
  const bytesBefore = socket.bytesRead
  const rows: ExactRow[] = []
  let watch: NodeJS.Timeout | undefined
  const read = new Promise<readonly ExactRow[]>((resolve, reject) => {
    let open = true
    const fail = (failure: Failure): void => {
      open = false
      reject(failure)
    }
    // One value can be a gigabyte long, and arrives as a row only when all of it is here.
    watch = setInterval(() => socket.bytesRead - bytesBefore > byteCeiling && fail(new Failure('vault')), 25)
    const asked = new Query({ text, rowMode: 'array', types: asText, queryMode: 'extended' } as ConstructorParameters<typeof Query>[0])
    asked.on('row', (row: TextRow) => {
      if (!open) return
      if (rows.length >= rowCeiling) return fail(new Failure('vault'))
      try {
        rows.push(exactRow(row, keyCount, totalCount))
      } catch (error) {
        fail(new Failure(error instanceof BrokenCheck ? 'internal' : 'vault'))
      }
    })
    asked.on('end', () => resolve(rows))
    asked.on('error', (error: unknown) => reject(new Failure(isTimeout(error) ? 'deadline' : 'vault')))
    client.query(asked)
  })
  return read.finally(() => clearInterval(watch))
}

function codeOf(error: unknown): string {
  const code: unknown = typeof error === 'object' && error !== null && 'code' in error ? error.code : ''
  return typeof code === 'string' ? code : ''
}

function isTimeout(error: unknown): boolean {
  return codeOf(error) === '57014'
}

/** Whether the connection, not the statement, went wrong. */
function isLost(error: unknown): boolean {
  return error instanceof Error && (codeOf(error) === '' || /^(57P|ECONN|EPIPE)/.test(codeOf(error)))
}
