import { mkdtemp, rm } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import pg from 'pg'
import { startServer } from '../embedded/server.ts'
import { ensureDatabase, withDatabase } from '../serve/databases.ts'
import { startHedgerow } from '../serve/hedgerow.ts'
import { stateKey } from '../serve/state-key.ts'
import { onStopSignal } from '../serve/stop-signal.ts'
import { lineLog, systemClock, systemRandom } from '../serve/system.ts'
import { readSettings } from '../settings.ts'
import { loadFerries } from './load-ferries.ts'
import { show } from './show.ts'
import { demoStatements } from './statements.ts'

const once = process.argv.includes('--once')
const say = (line: string): void => void process.stdout.write(`${line}\n`)
const closers: (() => Promise<unknown>)[] = []

async function stop(code: number): Promise<never> {
  for (const close of closers.splice(0).toReversed()) await close().catch(() => undefined)
  process.exit(code)
}

/** A line that is written over as the loading goes on; in a pipe, a line for each tenth. */
function progressLine(): (fraction: number, doing: string) => void {
  let told = -1
  return (fraction, doing) => {
    const percent = Math.floor(fraction * 100)
    if (process.stdout.isTTY)
      process.stdout.write(`\rloading the ferry company: ${percent.toString().padStart(3)} %  ${doing.padEnd(20)}${fraction === 1 ? '\n' : ''}`)
    else if (Math.floor(percent / 10) > told) {
      told = Math.floor(percent / 10)
      say(`loading the ferry company: ${percent.toString().padStart(3)} %  ${doing}`)
    }
  }
}

/** The port analysts connect to: the usual one, or any free one where it is taken. */
async function startOnAnyPort(options: Parameters<typeof startHedgerow>[0]): ReturnType<typeof startHedgerow> {
  try {
    return await startHedgerow(options)
  } catch (problem) {
    if (!(problem instanceof Error && 'code' in problem && problem.code === 'EADDRINUSE')) throw problem
    say(`port ${options.port.toString()} is taken: any free one is used instead`)
    return startHedgerow({ ...options, port: 0 })
  }
}

async function demo(): Promise<void> {
  const settings = readSettings()
  const directory = await mkdtemp(join(tmpdir(), 'hedgerow-demo-'))
  closers.push(() => rm(directory, { recursive: true, force: true }))
  say('starting PostgreSQL: one server stands in for the vault, the lobby and the ledger')
  const server = await startServer({
    directory,
    settings: { fsync: 'off', full_page_writes: 'off', synchronous_commit: 'on', max_wal_size: '2GB', shared_buffers: '256MB' },
  })
  closers.push(() => server.stop())
  const vaultUrl = await ensureDatabase(server.url(), 'ferry_vault')
  const started = Date.now()
  await loadFerries(vaultUrl, progressLine())
  say(`loaded in ${((Date.now() - started) / 1000).toFixed(1)} s`)
  const ledgerUrl = await ensureDatabase(server.url(), 'hedgerow_ledger')
  const here = dirname(fileURLToPath(import.meta.url))
  const hedgerow = await startOnAnyPort({
    vaultUrl: withDatabase(await readerUrl(server.url(), vaultUrl), 'ferry_vault'),
    lobbyUrl: server.url(),
    ledgerUrl,
    policies: join(here, '..', '..', 'policies'),
    host: settings.host,
    port: settings.port,
    pull: { host: settings.pullHost, listen: settings.pullListen, port: settings.pullPort },
    tls: null,
    statementTimeoutMs: settings.statementTimeoutMs,
    key: await stateKey(directory),
    log: lineLog((line) => (line.includes('"level":"error"') ? void process.stderr.write(line) : undefined)),
    clock: systemClock,
    random: systemRandom,
    allowUnsafeLedger: true,
    // the rows are invented: a slow machine should not pause the demo
    overrunsADay: 1000,
  })
  closers.push(() => hedgerow.close())
  const url = `postgresql://ana:harbour@${settings.host}:${hedgerow.port.toString()}/ferries`
  const failed = await runStatements(url)
  if (failed > 0) return void (await stop(1))
  if (once) return void (await stop(0))
  say(
    `\nHedgerow serves until Ctrl-C. Connect with\n\n    psql ${url}\n\n(ben's password is lanterns.) Try: \\d, EXPLAIN SELECT count(*) FROM trips, SELECT * FROM hedgerow.bounds`,
  )
}

async function runStatements(url: string): Promise<number> {
  const client = new pg.Client({ connectionString: url, application_name: 'hedgerow demo' })
  client.on('error', () => undefined)
  await client.connect()
  let failed = 0
  try {
    for (const [i, statement] of demoStatements.entries()) if (!(await show(client, statement, i + 1, say))) failed += 1
  } finally {
    await client.end()
  }
  return failed
}

/** A role for the vault that can read, and nothing else. */
async function readerUrl(serverUrl: string, vaultUrl: string): Promise<string> {
  const password = Buffer.from(systemRandom(18)).toString('base64url')
  const client = new pg.Client({ connectionString: vaultUrl })
  client.on('error', () => undefined)
  await client.connect()
  try {
    await client.query(`CREATE ROLE hedgerow_vault_reader LOGIN PASSWORD '${password}' CONNECTION LIMIT 40`)
    await client.query('ALTER ROLE hedgerow_vault_reader SET default_transaction_read_only = on')
    await client.query('GRANT CONNECT ON DATABASE ferry_vault TO hedgerow_vault_reader; GRANT SELECT ON ALL TABLES IN SCHEMA public TO hedgerow_vault_reader')
  } finally {
    await client.end()
  }
  const url = new URL(serverUrl)
  url.username = 'hedgerow_vault_reader'
  url.password = password
  return url.href
}

onStopSignal(() => {
  say('\nstopping')
  void stop(0)
})

try {
  await demo()
} catch (problem) {
  process.stderr.write(`${problem instanceof Error ? problem.message : 'unknown problem'}\n`)
  await stop(1)
}
