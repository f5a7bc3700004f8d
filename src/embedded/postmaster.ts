import { spawn } from 'node:child_process'
import { once } from 'node:events'
import { createServer } from 'node:net'
import type { Socket, AddressInfo } from 'node:net'
import { join } from 'node:path'
import type { ServerAccount } from './account.ts'
import { nameFromInside, serverEnvironment } from './data-directory.ts'
import { EmbeddedServerError } from './embedded-error.ts'
import { guardServer } from './guard.ts'
import { sendSignal } from './processes.ts'

/** A running postmaster that accepts connections. */
export interface Postmaster {
  readonly pid: number
  /** Resolves once it has ended, whoever ended it. */
  readonly ended: Promise<void>
  stop(): Promise<void>
}

/** What a postmaster is started from. */
export interface PostmasterSetUp {
  readonly native: string
  readonly dataDirectory: string
  readonly account: ServerAccount | undefined
  readonly port: number
  readonly settings: Readonly<Record<string, string>>
}

const readyWithinMs = 120_000

/** A port that was free a moment ago. */
export async function freePort(host: string): Promise<number> {
  const probe = createServer()
  probe.listen(0, host)
  await once(probe, 'listening')
  const { port } = probe.address() as AddressInfo
  probe.close()
  await once(probe, 'close')
  return port
}

/** Starts a postmaster and waits until it accepts connections; undefined where its port is taken. */
export async function startPostmaster(setUp: PostmasterSetUp): Promise<Postmaster | undefined> {
  const options = Object.entries(setUp.settings).flatMap(([name, value]) => ['-c', `${name}=${value}`])
  const child = spawn(join(setUp.native, 'bin', 'postgres'), ['-D', nameFromInside(setUp.dataDirectory), '-p', String(setUp.port), ...options], {
    ...setUp.account,
    cwd: setUp.dataDirectory,
    env: serverEnvironment,
    detached: true,
    stdio: ['ignore', 'ignore', 'pipe'],
  })
  const spawned = new Promise<void>((resolve, reject) => {
    child.once('error', reject)
    child.once('spawn', resolve)
  })
  await spawned
  const pid = child.pid as number
  const guard = guardServer(pid, setUp.account)
  const ended = new Promise<void>((resolve) => child.once('close', () => resolve()))
  void ended.then(() => guard.dismiss())
  const said = await readyOrEnded(child.stderr as Socket, ended, pid)
  if (said === undefined) {
    child.unref()
    ;(child.stderr as Socket).unref()
    return { pid, ended, stop: async () => await stopChild(child, pid, ended) }
  }
  if (/could not bind|Address already in use/i.test(said)) return undefined
  throw new EmbeddedServerError(`PostgreSQL did not start in ${setUp.dataDirectory}`, said.trim() || 'it ended without a word')
}

/** Undefined once the server accepts connections; what it said if it ended before. After that its words are dropped: they may quote statements. */
async function readyOrEnded(output: Socket, ended: Promise<void>, pid: number): Promise<string | undefined> {
  let said = ''
  const ready = new Promise<undefined>((resolve) => {
    output.on('data', (part: Buffer) => {
      if (said.length > 20_000) return
      said += part.toString('utf8')
      if (said.includes('database system is ready to accept connections')) {
        said = ''.padEnd(20_001)
        resolve(undefined)
      }
    })
  })
  const deadline = setTimeout(() => sendSignal(pid, 'SIGQUIT'), readyWithinMs)
  try {
    return await Promise.race([ready, ended.then(() => said)])
  } finally {
    clearTimeout(deadline)
  }
}

/** A fast shutdown; an immediate one after 10 s, and the end after 5 more. */
async function stopChild(child: { ref(): void }, pid: number, ended: Promise<void>): Promise<void> {
  child.ref()
  sendSignal(pid, 'SIGINT')
  const later = [setTimeout(() => sendSignal(pid, 'SIGQUIT'), 10_000), setTimeout(() => sendSignal(pid, 'SIGKILL'), 15_000)]
  try {
    await ended
  } finally {
    for (const timer of later) clearTimeout(timer)
  }
}
