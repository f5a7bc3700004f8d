import { once } from 'node:events'
import { readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs'
import { connect, createServer } from 'node:net'
import type { AddressInfo } from 'node:net'
import { networkInterfaces } from 'node:os'
import { join } from 'node:path'
import pg from 'pg'
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, test } from 'vitest'
import { startServer } from '../../src/embedded/server.ts'
import type { EmbeddedServer, EmbeddedServerOptions } from '../../src/embedded/server.ts'
import { scratchDirectory } from '../harness/server.ts'
import { gone, running } from './launched.ts'
import { lightSettings, makeState } from './made-state.ts'
import type { MadeState } from './made-state.ts'

let made: MadeState
let scratch: ReturnType<typeof scratchDirectory>
let directory: string
let started: EmbeddedServer[]

beforeAll(async () => {
  made = await makeState()
})

afterAll(() => made.remove())

beforeEach(() => {
  scratch = scratchDirectory('hedgerow-embedded')
  directory = join(scratch.path, 'state')
  made.copyTo(directory)
  started = []
})

afterEach(async () => {
  for (const server of started) await server.stop()
  scratch.remove()
})

async function start(more: Partial<EmbeddedServerOptions> = {}): Promise<EmbeddedServer> {
  const server = await startServer({ directory, settings: lightSettings, ...more })
  started.push(server)
  return server
}

async function rows(url: string, sql: string): Promise<unknown[]> {
  const client = new pg.Client({ connectionString: url })
  client.on('error', () => undefined)
  await client.connect()
  try {
    return (await client.query(sql)).rows as unknown[]
  } finally {
    await client.end()
  }
}

describe('a started server', () => {
  test('answers on its own host alone, in UTF-8 and UTC, and has dblink', async () => {
    const server = await start()
    expect(
      await rows(
        server.url(),
        "SELECT current_setting('server_encoding') AS encoding, current_setting('TimeZone') AS zone, current_setting('unix_socket_directories') AS sockets",
      ),
    ).toEqual([{ encoding: 'UTF8', zone: 'UTC', sockets: '' }])
    await rows(server.url(), 'CREATE EXTENSION dblink')
    const others = Object.values(networkInterfaces()).flatMap((addresses) => (addresses ?? []).filter(({ internal, family }) => !internal && family === 'IPv4'))
    for (const { address } of others) {
      const socket = connect({ host: address, port: server.port })
      const [error] = (await once(socket, 'error')) as [NodeJS.ErrnoException]
      expect(error.code).toBe('ECONNREFUSED')
    }
  })

  test('lets nobody in without the password', async () => {
    const server = await start()
    expect(await rows(server.url(), 'SELECT DISTINCT auth_method FROM pg_hba_file_rules')).toEqual([{ auth_method: 'scram-sha-256' }])
    const wrong = new URL(server.url())
    wrong.password = 'guess'
    await expect(rows(wrong.href, 'SELECT 1')).rejects.toThrow(/password authentication failed/)
  })

  test('keeps its data and its password to its owner, from the first start', async () => {
    directory = join(scratch.path, 'fresh')
    await start()
    const home = join(directory, 'postgresql')
    const modes = (path: string): number => statSync(path).mode & 0o777
    expect(modes(home)).toBe(0o700)
    expect(modes(join(home, 'data'))).toBe(0o700)
    expect(modes(join(home, 'password'))).toBe(0o600)
    expect(readFileSync(join(home, 'password'), 'utf8')).toMatch(/^[\w-]{32}\n$/)
    expect(statSync(join(home, 'password')).uid).toBe(process.getuid?.())
    const open = readdirSync(join(home, 'data'), { recursive: true, encoding: 'utf8' }).filter((name) => {
      const found = statSync(join(home, 'data', name), { throwIfNoEntry: false })
      return found !== undefined && (found.mode & 0o077) !== 0
    })
    expect(open).toEqual([])
  })

  test('does not run as root', async () => {
    const server = await start()
    if (process.platform === 'linux') expect(readFileSync(`/proc/${server.pid}/status`, 'utf8')).not.toMatch(/^Uid:.*\b0\b/m)
    expect(statSync(join(directory, 'postgresql', 'data')).uid).not.toBe(0)
  })

  test('stops when told, also twice, and says so', async () => {
    const server = await start()
    await Promise.all([server.stop(), server.stop()])
    await server.ended
    expect(await running(server.pid)).toBe(false)
    await expect(rows(server.url(), 'SELECT 1')).rejects.toThrow(/ECONNREFUSED/)
  })

  test('shuts down in spite of an open transaction', async () => {
    const server = await start()
    const client = new pg.Client({ connectionString: server.url() })
    client.on('error', () => undefined)
    await client.connect()
    await client.query('BEGIN; CREATE TABLE half ()')
    const before = Date.now()
    await server.stop()
    expect(Date.now() - before).toBeLessThan(5_000)
  })

  test('has its data and its password again after a second start, with any settings', async () => {
    const first = await start()
    await rows(first.url(), 'CREATE TABLE kept AS SELECT 7 AS n')
    await first.stop()
    const second = await start({ settings: { ...lightSettings, max_connections: '23' } })
    expect(await rows(second.url(), "SELECT n, current_setting('max_connections') AS most FROM kept")).toEqual([{ n: 7, most: '23' }])
    expect(new URL(second.url()).password).toBe(new URL(first.url()).password)
  })

  test('listens on the port asked for', async () => {
    const free = (await start()).port
    await started[0]?.stop()
    expect((await start({ port: free })).port).toBe(free)
  })
})

describe('a start that cannot succeed', () => {
  test('names the taken port', async () => {
    const other = createServer().listen(0, '127.0.0.1')
    await once(other, 'listening')
    const { port } = other.address() as AddressInfo
    await expect(start({ port })).rejects.toThrow(`port ${port} of 127.0.0.1 is taken: stop what listens there, or choose another port`)
    other.close()
    await expect(start()).resolves.toBeDefined()
  })

  test('names the process that has the directory; of several at once exactly one starts', async () => {
    const results = await Promise.allSettled([start(), start(), start(), start()])
    expect(results.filter(({ status }) => status === 'fulfilled')).toHaveLength(1)
    for (const result of results) if (result.status === 'rejected') expect(String(result.reason)).toContain(`is in use by process ${process.pid}`)
    const [server] = started
    expect(await rows(server?.url() ?? '', 'SELECT 1 AS one')).toEqual([{ one: 1 }])
  })

  test('says what a wrong setting is, and leaves nothing running', async () => {
    await expect(start({ settings: { shared_bufers: '1' } })).rejects.toThrow(/shared_bufers/)
    await expect(start()).resolves.toBeDefined()
  })

  test('does not touch data of another PostgreSQL version', async () => {
    await (await start()).stop()
    writeFileSync(join(directory, 'postgresql', 'data', 'PG_VERSION'), '12\n')
    await expect(start()).rejects.toThrow(/is of PostgreSQL 12, the installed one is 18/)
  })

  test('does not make a new password for data whose password is gone', async () => {
    await (await start()).stop()
    rmSync(join(directory, 'postgresql', 'password'))
    await expect(start()).rejects.toThrow(/the password file .* is gone/)
  })

  test('says what is wrong with a directory that is none', async () => {
    const file = join(scratch.path, 'file')
    writeFileSync(file, '')
    await expect(start({ directory: join(file, 'below') })).rejects.toThrow(/cannot be used \(ENOTDIR\): make it writable/)
  })
})

describe('a server that ends by itself', () => {
  test('is noticed, and its directory can be started again', async () => {
    const server = await start()
    process.kill(server.pid, 'SIGKILL')
    await server.ended
    expect(await gone(server.pid)).toBe(true)
    await server.stop()
    expect(await rows((await start()).url(), 'SELECT 1 AS one')).toEqual([{ one: 1 }])
  })
})
