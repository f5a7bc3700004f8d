import { execFile } from 'node:child_process'
import { readdir, readFile, readlink, realpath, rm } from 'node:fs/promises'
import { join } from 'node:path'
import { setTimeout as sleep } from 'node:timers/promises'
import { promisify } from 'node:util'
import { EmbeddedServerError } from './embedded-error.ts'

const run = promisify(execFile)

/** Tells a process from a later one with the same number: undefined once it is gone. */
export async function processIdentity(pid: number): Promise<string | undefined> {
  if (process.platform !== 'linux')
    return await run('/bin/ps', ['-o', 'lstart=', '-p', String(pid)]).then(
      ({ stdout }) => `${pid} ${stdout.trim()}`,
      () => undefined,
    )
  try {
    const [boot, line] = await Promise.all([readFile('/proc/sys/kernel/random/boot_id', 'utf8'), readFile(`/proc/${pid}/stat`, 'utf8')])
    const fields = line.slice(line.lastIndexOf(')') + 2).split(' ')
    return fields[0] === 'Z' ? undefined : `${pid} ${fields[19] ?? ''} ${boot.trim()}`
  } catch {
    return undefined
  }
}

/** Every running process of a PostgreSQL that was started in `dataDirectory`, postmaster or orphan. */
export async function serversOf(dataDirectory: string): Promise<readonly number[]> {
  const directory = await realpath(dataDirectory).catch(() => dataDirectory)
  return process.platform === 'linux' ? await workingIn(directory) : await namedIn(directory)
}

/** PostgreSQL's processes all work in their data directory. Those of other accounts cannot be seen, and cannot be working in a directory that is closed to them. */
async function workingIn(directory: string): Promise<readonly number[]> {
  const numbers = (await readdir('/proc')).filter((name) => /^\d+$/.test(name))
  const found = await Promise.all(
    numbers.map(async (pid) => {
      try {
        const [cwd, name] = await Promise.all([readlink(`/proc/${pid}/cwd`), readFile(`/proc/${pid}/comm`, 'utf8')])
        return cwd === directory && name.trim() === 'postgres' ? [Number(pid)] : []
      } catch {
        return []
      }
    }),
  )
  return found.flat()
}

async function namedIn(directory: string): Promise<readonly number[]> {
  const pid = (await readFile(join(directory, 'postmaster.pid'), 'utf8').catch(() => '')).split('\n')[0] ?? ''
  if (!/^\d+$/.test(pid)) return []
  const command = await run('/bin/ps', ['-o', 'command=', '-p', pid]).then(
    ({ stdout }) => stdout,
    () => '',
  )
  return command.includes('postgres') && command.includes(directory) ? [Number(pid)] : []
}

/** Ends every server process of `dataDirectory`: asks for a fast shutdown, then for an immediate one, then kills. */
export async function endServersOf(dataDirectory: string): Promise<void> {
  const stages = [
    { signal: 'SIGINT', waitMs: 15_000 },
    { signal: 'SIGQUIT', waitMs: 5_000 },
    { signal: 'SIGKILL', waitMs: 5_000 },
  ] as const
  for (const { signal, waitMs } of stages) {
    for (const pid of await serversOf(dataDirectory)) sendSignal(pid, signal)
    for (const until = Date.now() + waitMs; Date.now() < until; await sleep(50)) if ((await serversOf(dataDirectory)).length === 0) return
  }
  throw new EmbeddedServerError(`a PostgreSQL left over in ${dataDirectory} does not end`, 'end it by hand, then start again')
}

/**
 * Removes the pid file of a server that is gone, after `endServersOf`. PostgreSQL refuses to start where the number in it is some living process's, or a zombie's. It stays where
 * processes cannot be told by their directory: PostgreSQL then finds orphans through it.
 */
export async function removeStalePidFile(dataDirectory: string): Promise<void> {
  const file = join(dataDirectory, 'postmaster.pid')
  const pid = Number.parseInt(await readFile(file, 'utf8').catch(() => ''), 10)
  if (process.platform === 'linux' || (Number.isInteger(pid) && (await processIdentity(pid)) !== undefined)) await rm(file, { force: true })
}

/** Sends the signal; a process that is gone already is no error. */
export function sendSignal(pid: number, signal: NodeJS.Signals): void {
  try {
    process.kill(pid, signal)
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'ESRCH') throw error
  }
}
