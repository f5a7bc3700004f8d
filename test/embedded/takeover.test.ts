import { spawn } from 'node:child_process'
import { once } from 'node:events'
import { chownSync, cpSync, mkdirSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import pg from 'pg'
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import { packagedBinaries } from '../../src/embedded/binaries.ts'
import { startServer } from '../../src/embedded/server.ts'
import type { EmbeddedServerOptions } from '../../src/embedded/server.ts'
import { scratchDirectory } from '../harness/server.ts'
import { endLaunched, gone, launch, running, writeLauncher } from './launched.ts'
import type { Launched } from './launched.ts'
import { lightSettings, makeState } from './made-state.ts'
import type { MadeState } from './made-state.ts'

let made: MadeState
let scratch: ReturnType<typeof scratchDirectory>
let launcher: string
const launches: Launched[] = []

beforeAll(async () => {
  made = await makeState()
})

afterAll(() => made.remove())

beforeEach(() => {
  scratch = scratchDirectory('hedgerow-takeover')
  launcher = writeLauncher(scratch.path)
  made.copyTo(options().directory)
})

afterEach(async () => {
  for (const one of launches.splice(0)) {
    await endLaunched(one)
    await gone(one.pid)
  }
  scratch.remove()
})

async function launchOne(): Promise<Launched> {
  const one = await launch(launcher, options())
  launches.push(one)
  return one
}

function options(): EmbeddedServerOptions {
  return { directory: join(scratch.path, 'state'), settings: lightSettings, native: packagedBinaries() }
}

async function query(url: string, sql: string): Promise<unknown[]> {
  const client = new pg.Client({ connectionString: url })
  client.on('error', () => undefined)
  await client.connect()
  try {
    return (await client.query(sql)).rows as unknown[]
  } finally {
    await client.end()
  }
}

/** The shells that watch servers, by the server's number in their arguments. */
function guardsOf(pid: number): readonly number[] {
  return readdirSync('/proc')
    .filter((name) => /^\d+$/.test(name))
    .filter((name) => {
      try {
        const words = readFileSync(`/proc/${name}/cmdline`, 'utf8').split('\0')
        return words.includes('hedgerow-guard') && words.includes(String(pid))
      } catch {
        return false
      }
    })
    .map(Number)
}

describe('the end of the process that started a server', () => {
  test.each(['SIGINT', 'SIGTERM', 'SIGHUP', 'SIGKILL'] as const)('by %s ends the server', async (signal) => {
    const launched = await launchOne()
    const { pid } = launched
    await endLaunched(launched, signal)
    expect(await gone(pid)).toBe(true)
  })

  test('by process.exit ends the server', async () => {
    const { child, pid } = await launchOne()
    const exited = once(child, 'exit')
    child.stdin?.write('exit\n')
    expect(await exited).toEqual([0, null])
    expect(await gone(pid)).toBe(true)
  })

  test('lets a new start succeed at once, with what was committed', async () => {
    const launched = await launchOne()
    const { url, pid } = launched
    await query(url, 'CREATE TABLE kept AS SELECT 7 AS n')
    await endLaunched(launched)
    const server = await startServer(options())
    try {
      expect(await running(pid)).toBe(false)
      expect(await query(server.url(), 'SELECT n FROM kept')).toEqual([{ n: 7 }])
    } finally {
      await server.stop()
    }
  })
})

describe('what a killed process left behind', () => {
  test.runIf(process.platform === 'linux')('a server that still runs is stopped first, and its connections with it', async () => {
    const launched = await launchOne()
    const { url, pid } = launched
    await query(url, 'CREATE TABLE kept AS SELECT 7 AS n')
    for (const guard of guardsOf(pid)) process.kill(guard, 'SIGKILL')
    await endLaunched(launched)
    expect(await running(pid)).toBe(true)
    const server = await startServer(options())
    try {
      expect(await running(pid)).toBe(false)
      expect(await query(server.url(), 'SELECT n FROM kept')).toEqual([{ n: 7 }])
    } finally {
      await server.stop()
    }
  })

  test.each<[string, () => Promise<Other>]>([
    ['a process that is gone', dead],
    ['a living process that is no PostgreSQL', async () => sleeper()],
  ])('a pid file of %s is no obstacle', async (_, other) => {
    const { pid, end } = await other()
    const data = join(options().directory, 'postgresql', 'data')
    writeFileSync(join(data, 'postmaster.pid'), `${pid}\n${data}\n1780000000\n5432\n\n127.0.0.1\n\nready\n`)
    const server = await startServer(options())
    try {
      expect(await query(server.url(), 'SELECT 1 AS one')).toEqual([{ one: 1 }])
    } finally {
      end()
      await server.stop()
    }
  })

  test('half a data directory is made anew', async () => {
    const home = join(options().directory, 'postgresql')
    rmSync(options().directory, { recursive: true })
    mkdirSync(join(home, 'data.new'), { recursive: true })
    writeFileSync(join(home, 'data.new', 'PG_VERSION'), '18\n')
    const server = await startServer(options())
    await server.stop()
    expect(readdirSync(home).toSorted()).toEqual(['data', expect.stringMatching(/^holder\.\d+$/), 'password'])
  })

  test('a directory that another process has is not taken over', async () => {
    const { child, url } = await launchOne()
    await expect(startServer(options())).rejects.toThrow(`is in use by process ${child.pid}`)
    expect(await query(url, 'SELECT 1 AS one')).toEqual([{ one: 1 }])
  })

  test('a copy of a data directory is another directory: the running one is left alone', async () => {
    const { url } = await launchOne()
    const copy = join(scratch.path, 'copy', 'postgresql')
    cpSync(join(options().directory, 'postgresql'), copy, { recursive: true, filter: (name) => !name.includes('holder.') })
    if (process.getuid?.() === 0) chownAll(join(copy, 'data'), statSync(join(options().directory, 'postgresql', 'data')))
    const second = await startServer({ ...options(), directory: dirname(copy) })
    await second.stop()
    expect(await query(url, 'SELECT 1 AS one')).toEqual([{ one: 1 }])
  })
})

function chownAll(directory: string, { uid, gid }: { readonly uid: number; readonly gid: number }): void {
  chownSync(directory, uid, gid)
  for (const name of readdirSync(directory, { recursive: true, encoding: 'utf8' })) chownSync(join(directory, name), uid, gid)
}

interface Other {
  readonly pid: number
  readonly end: () => void
}

async function dead(): Promise<Other> {
  const { pid, end } = sleeper()
  end()
  await gone(pid)
  return { pid, end: () => undefined }
}

function sleeper(): Other {
  const child = spawn('/bin/sleep', ['60'])
  return { pid: child.pid ?? 0, end: () => void child.kill('SIGKILL') }
}
