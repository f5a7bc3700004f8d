import { chmod, mkdir, stat } from 'node:fs/promises'
import { join, resolve } from 'node:path'
import type { Log } from '../base/ports.ts'
import { serverAccount } from './account.ts'
import { packagedBinaries, runnableBinaries } from './binaries.ts'
import { makeDataDirectory, superuser, superuserPassword } from './data-directory.ts'
import { EmbeddedServerError } from './embedded-error.ts'
import { holdDirectory } from './hold.ts'
import { freePort, startPostmaster } from './postmaster.ts'
import type { Postmaster } from './postmaster.ts'
import { endServersOf, removeStalePidFile } from './processes.ts'

const host = '127.0.0.1'

/** Where and how an embedded PostgreSQL runs. */
export interface EmbeddedServerOptions {
  /** Made where missing. The server's own directory `postgresql` below it can be read by its owner alone. */
  readonly directory: string
  /** 0 or missing: any free one. */
  readonly port?: number
  /** PostgreSQL settings on top of ours, for this start. */
  readonly settings?: Readonly<Record<string, string>>
  readonly log?: Log
  /** Where PostgreSQL's bin, lib and share are; by default in the npm package of this platform. */
  readonly native?: string
}

/** A PostgreSQL of our own, with one superuser; it ends with this process at the latest. */
export interface EmbeddedServer {
  readonly host: string
  readonly port: number
  readonly pid: number
  /** The superuser's connection string, password included. */
  url(database?: string): string
  /** Resolves once the server has ended, whoever ended it. */
  readonly ended: Promise<void>
  /** Shuts the server down; a second call waits for the first. */
  stop(): Promise<void>
}

/** Only our own host can connect, only with a password, and no statement's text gets into the server's log. */
const fixedSettings = {
  listen_addresses: host,
  unix_socket_directories: '',
  password_encryption: 'scram-sha-256',
  lc_messages: 'C',
  log_destination: 'stderr',
  log_min_messages: 'log',
  log_min_error_statement: 'panic',
  log_statement: 'none',
  log_checkpoints: 'off',
} as const

/**
 * Starts PostgreSQL in `options.directory`; the data directory is made on first use. One process at a time has a directory; what a killed one left running is stopped first.
 * Throws EmbeddedServerError.
 */
export async function startServer(options: EmbeddedServerOptions): Promise<EmbeddedServer> {
  const native = options.native ?? packagedBinaries()
  const home = await ownDirectory(resolve(options.directory))
  const hold = await holdDirectory(home)
  try {
    const dataDirectory = join(home, 'data')
    const account = serverAccount(dataDirectory)
    await endServersOf(dataDirectory)
    await removeStalePidFile(dataDirectory)
    const runnable = await runnableBinaries(native, account)
    const password = await superuserPassword(join(home, 'password'), dataDirectory)
    const settings: Readonly<Record<string, string>> = { ...fixedSettings, ...options.settings }
    await makeDataDirectory(runnable, dataDirectory, password, account, settings['fsync'] !== 'off')
    const { port, postmaster } = await onFreePort(
      options.port ?? 0,
      async (chosen) => await startPostmaster({ native: runnable, dataDirectory, account, port: chosen, settings }),
    )
    options.log?.('info', 'embedded.started', { port, pid: postmaster.pid })
    void postmaster.ended.then(() => options.log?.('info', 'embedded.ended', { port, pid: postmaster.pid }))
    let stopping: Promise<void> | undefined
    return {
      host,
      port,
      pid: postmaster.pid,
      url: (database = 'postgres') => `postgresql://${superuser}:${password}@${host}:${port}/${encodeURIComponent(database)}`,
      ended: postmaster.ended,
      stop: async () => await (stopping ??= postmaster.stop().then(async () => await hold.release())),
    }
  } catch (error) {
    await hold.release()
    throw error
  }
}

/** INVARIANT OWN: the server's directory is ours and of mode 0700; what it holds need not be checked again. */
async function ownDirectory(directory: string): Promise<string> {
  const home = join(directory, 'postgresql')
  try {
    await mkdir(directory, { recursive: true, mode: 0o700 })
    await mkdir(home, { recursive: true, mode: 0o700 })
    const us = process.getuid?.() ?? 0
    const { uid, mode } = await stat(home)
    if (uid !== us && us !== 0)
      throw new EmbeddedServerError(`the state directory ${home} belongs to another account`, 'start as its owner, or set HEDGEROW_STATE to another directory')
    if ((mode & 0o777) !== 0o700) await chmod(home, 0o700)
    return home
  } catch (error) {
    if (error instanceof EmbeddedServerError) throw error
    throw new EmbeddedServerError(
      `the state directory ${directory} cannot be used (${(error as NodeJS.ErrnoException).code ?? 'unknown'})`,
      'make it writable for this account, or set HEDGEROW_STATE to another directory',
    )
  }
}

/** A port can be taken between our look and the server's: another is tried, unless it was asked for by number. */
async function onFreePort(
  wanted: number,
  start: (port: number) => Promise<Postmaster | undefined>,
): Promise<{ readonly port: number; readonly postmaster: Postmaster }> {
  for (let attempt = 0; attempt < 10; attempt++) {
    const port = wanted === 0 ? await freePort(host) : wanted
    const postmaster = await start(port)
    if (postmaster !== undefined) return { port, postmaster }
    if (wanted !== 0) throw new EmbeddedServerError(`port ${wanted} of ${host} is taken`, 'stop what listens there, or choose another port')
  }
  throw new EmbeddedServerError(`no free port was found on ${host}`, 'stop something that listens there')
}
