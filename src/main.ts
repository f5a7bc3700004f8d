import { readFile } from 'node:fs/promises'
import { join } from 'node:path'
import { startServer } from './embedded/server.ts'
import { watchPolicies } from './files/watch-policies.ts'
import { ensureDatabase } from './serve/databases.ts'
import { type Hedgerow, PoliciesUnfit, startHedgerow } from './serve/hedgerow.ts'
import { stateKey } from './serve/state-key.ts'
import { onStopSignal } from './serve/stop-signal.ts'
import { lineLog, systemClock, systemRandom } from './serve/system.ts'
import { readSettings, SettingsError } from './settings.ts'

const log = lineLog((line) => process.stdout.write(line))
const closers: (() => Promise<void>)[] = []

/** Ends in the reverse of the start's order: sessions first, servers last. */
async function stop(code: number): Promise<never> {
  for (const close of closers.splice(0).toReversed()) await close().catch(() => undefined)
  process.exit(code)
}

async function serve(): Promise<Hedgerow> {
  const settings = readSettings()
  if (settings.vaultUrl === null) throw new SettingsError(['HEDGEROW_VAULT_URL is not set: it is the connection string of the database with people’s rows'])
  const key = await stateKey(settings.state)
  let { lobbyUrl } = settings
  if (lobbyUrl === null) {
    const server = await startServer({ directory: join(settings.state, 'lobby'), log })
    closers.push(() => server.stop())
    lobbyUrl = server.url()
  }
  const ledgerUrl = settings.ledgerUrl ?? (await ensureDatabase(lobbyUrl, 'hedgerow_ledger'))
  const tls = settings.tls === null ? null : { cert: await readFile(settings.tls.cert, 'utf8'), key: await readFile(settings.tls.key, 'utf8') }
  const hedgerow = await startHedgerow({
    vaultUrl: settings.vaultUrl,
    lobbyUrl,
    ledgerUrl,
    policies: settings.policies,
    host: settings.host,
    port: settings.port,
    pull: { host: settings.pullHost, listen: settings.pullListen, port: settings.pullPort },
    tls,
    statementTimeoutMs: settings.statementTimeoutMs,
    key,
    log,
    clock: systemClock,
    random: systemRandom,
  })
  closers.push(() => hedgerow.close())
  const watch = watchPolicies(
    settings.policies,
    () => void hedgerow.reload(),
    (code) => log('error', 'policy.watch', { code }),
  )
  closers.push(() => Promise.resolve(watch.close()))
  process.on('SIGHUP', () => void hedgerow.reload())
  log('info', 'serve.ready', { host: settings.host, port: hedgerow.port })
  return hedgerow
}

onStopSignal((signal) => {
  log('info', 'serve.stopping', { signal })
  void stop(0)
})

try {
  await serve()
} catch (problem) {
  const lines =
    problem instanceof SettingsError || problem instanceof PoliciesUnfit ? problem.complaints : [problem instanceof Error ? problem.message : 'unknown problem']
  for (const line of lines) log('error', 'serve.cannot_start', { text: line })
  await stop(1)
}
