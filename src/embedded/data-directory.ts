import { execFile } from 'node:child_process'
import { randomBytes } from 'node:crypto'
import { chown, mkdir, open, readFile, rename, rm, stat, unlink } from 'node:fs/promises'
import { join } from 'node:path'
import { spawn } from 'node:child_process'
import type { ServerAccount } from './account.ts'
import { EmbeddedServerError } from './embedded-error.ts'

/** The name of the embedded server's superuser. */
export const superuser = 'postgres'

/** What PostgreSQL's programs see of our environment: nothing. */
export const serverEnvironment = { LC_ALL: 'C', TZ: 'UTC', PATH: '/usr/local/bin:/usr/bin:/bin' } as const

/**
 * How a program that works in the data directory names it. Below a directory that its account may not enter (a home of mode 0700, as root) no path leads to it, but its own working
 * directory does: that is handed to it while we still are root.
 */
export function nameFromInside(dataDirectory: string): string {
  return process.platform === 'linux' ? '/proc/self/cwd' : dataDirectory
}

/** The password in `file`, made on first use: 24 random bytes in a file only its owner can read. */
export async function superuserPassword(file: string, dataDirectory: string): Promise<string> {
  const kept = await readFile(file, 'utf8').catch((error: NodeJS.ErrnoException) => {
    if (error.code === 'ENOENT') return ''
    throw error
  })
  if (kept !== '') return kept.trim()
  if (
    await stat(dataDirectory).then(
      () => true,
      () => false,
    )
  ) {
    throw new EmbeddedServerError(
      `the password file ${file} of the data in ${dataDirectory} is gone`,
      'put it back from a backup, or remove the state directory and with it every account of it',
    )
  }
  const password = randomBytes(24).toString('base64url')
  await writeDurably(file, `${password}\n`)
  return password
}

async function writeDurably(file: string, text: string): Promise<void> {
  await rm(`${file}.new`, { force: true })
  const handle = await open(`${file}.new`, 'wx', 0o600)
  try {
    await handle.writeFile(text)
    await handle.sync()
  } finally {
    await handle.close()
  }
  await rename(`${file}.new`, file)
}

/**
 * Makes the data directory where there is none, for SCRAM log-ins only. It appears under its name when it is complete: what a killed start left behind is made anew. With `durable`
 * it is on disk before anything is written to it.
 */
export async function makeDataDirectory(
  native: string,
  dataDirectory: string,
  password: string,
  account: ServerAccount | undefined,
  durable: boolean,
): Promise<void> {
  const version = await readFile(join(dataDirectory, 'PG_VERSION'), 'utf8').catch(() => undefined)
  if (version !== undefined) return await checkVersion(native, dataDirectory, version.trim())
  const fresh = `${dataDirectory}.new`
  await rm(fresh, { recursive: true, force: true })
  await mkdir(fresh, { mode: 0o700 })
  if (account !== undefined) await chown(fresh, account.uid, account.gid)
  await initialise(native, fresh, password, account, durable)
  await rename(fresh, dataDirectory)
}

async function checkVersion(native: string, dataDirectory: string, version: string): Promise<void> {
  const ours = await new Promise<string>((resolve, reject) => {
    execFile(join(native, 'bin', 'postgres'), ['--version'], { env: serverEnvironment }, (error, stdout) => (error ? reject(error) : resolve(stdout)))
  })
  const major = / (\d+)/.exec(ours)?.[1]
  if (major === version) return
  throw new EmbeddedServerError(
    `the data in ${dataDirectory} is of PostgreSQL ${version}, the installed one is ${major ?? 'unknown'}`,
    'move it with pg_dump and pg_restore, or set HEDGEROW_STATE to another directory',
  )
}

/** The password reaches initdb through an open file without a name, which its account can read whatever directory it was made in. */
async function initialise(native: string, directory: string, password: string, account: ServerAccount | undefined, durable: boolean): Promise<void> {
  const name = `${directory}.password`
  await rm(name, { force: true })
  const file = await open(name, 'wx+', 0o600)
  try {
    await file.writeFile(`${password}\n`)
    if (account !== undefined) await file.chown(account.uid, account.gid)
    await file.close()
    const reading = await open(name, 'r')
    try {
      await unlink(name)
      await runInitdb(native, directory, account, durable, reading.fd)
    } finally {
      await reading.close()
    }
  } finally {
    await rm(name, { force: true })
  }
}

async function runInitdb(native: string, directory: string, account: ServerAccount | undefined, durable: boolean, passwordFd: number): Promise<void> {
  const options = [
    ...['-D', nameFromInside(directory), '-U', superuser, '--auth=scram-sha-256', '--pwfile=/dev/fd/3', '--encoding=UTF8'],
    ...['--locale-provider=builtin', '--builtin-locale=C.UTF-8', '--locale=C', ...(durable ? [] : ['--no-sync'])],
  ]
  const child = spawn(join(native, 'bin', 'initdb'), options, {
    cwd: directory,
    env: serverEnvironment,
    ...account,
    stdio: ['ignore', 'ignore', 'pipe', passwordFd],
  })
  const said: Buffer[] = []
  child.stderr?.on('data', (part: Buffer) => said.push(part))
  const code = await new Promise<number | null>((resolve, reject) => {
    child.once('error', reject)
    child.once('close', resolve)
  })
  if (code === 0) return
  throw new EmbeddedServerError(
    `PostgreSQL's initdb failed in ${directory}`,
    Buffer.concat(said).toString('utf8').trim() || `it ended with code ${String(code)}`,
  )
}
