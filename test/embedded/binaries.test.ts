import { once } from 'node:events'
import { chmodSync, chownSync, cpSync, existsSync, lstatSync, mkdirSync, readFileSync, rmSync, statSync } from 'node:fs'
import { dirname, join } from 'node:path'
import pg from 'pg'
import { afterEach, beforeEach, describe, expect, test } from 'vitest'
import { serverAccount } from '../../src/embedded/account.ts'
import { packagedBinaries, runnableBinaries } from '../../src/embedded/binaries.ts'
import { scratchDirectory } from '../harness/server.ts'
import { gone, launch, writeLauncher } from './launched.ts'
import { lightSettings } from './made-state.ts'

const root = process.getuid?.() === 0

let scratch: ReturnType<typeof scratchDirectory>

beforeEach(() => {
  scratch = scratchDirectory('hedgerow-binaries')
})

afterEach(() => scratch.remove())

/** The platform's package as npm leaves it when it runs no install script: without links. */
function packageWithoutLinks(below: string): string {
  const native = join(below, 'package', 'native')
  mkdirSync(dirname(native), { recursive: true })
  cpSync(join(packagedBinaries(), '..', 'package.json'), join(native, '..', 'package.json'))
  cpSync(packagedBinaries(), native, { recursive: true, filter: (path) => !lstatSync(path).isSymbolicLink() })
  return native
}

describe('the programs of PostgreSQL', () => {
  test('are used where npm put them, and missing links are made there', async () => {
    const native = packageWithoutLinks(scratch.path)
    const links = (JSON.parse(readFileSync(join(native, 'pg-symlinks.json'), 'utf8')) as { target: string }[]).map(({ target }) => join(native, '..', target))
    expect(links.length).toBeGreaterThan(0)
    expect(links.filter((link) => existsSync(link))).toEqual([])
    const both = await Promise.all([runnableBinaries(native, undefined), runnableBinaries(native, undefined)])
    expect(both).toEqual([native, native])
    expect(links.filter((link) => !existsSync(link))).toEqual([])
  })

  test.runIf(root)('are copied whole for an account that cannot reach them, once for all starts, and again where the copy was damaged', async () => {
    const native = packageWithoutLinks(scratch.path)
    chmodSync(join(native, 'share', 'postgresql', 'postgres.bki'), 0o600)
    const account = serverAccount(join(scratch.path, 'nowhere'))
    const [first, second] = await Promise.all([runnableBinaries(native, account), runnableBinaries(native, account)])
    expect(first).toBe(second)
    expect(first).not.toContain(scratch.path)
    expect(statSync(join(first, 'share', 'postgresql', 'postgres.bki')).mode & 0o777).toBe(0o644)
    expect(statSync(join(first, 'bin', 'postgres')).mode & 0o777).toBe(0o755)
    expect(statSync(first).uid).toBe(0)
    const before = statSync(first).ino
    expect(await runnableBinaries(native, account)).toBe(first)
    expect(statSync(first).ino).toBe(before)
    rmSync(join(first, 'bin', 'initdb'))
    expect(await runnableBinaries(native, account)).toBe(first)
    expect(existsSync(join(first, 'bin', 'initdb'))).toBe(true)
  })
})

describe.runIf(root)('a server started by an unprivileged account', () => {
  test('runs as that account, from a package it can neither write to nor finds links in', async () => {
    const account = { uid: 65534, gid: 65534 }
    chmodSync(scratch.path, 0o755)
    const native = packageWithoutLinks(scratch.path)
    const launcher = writeLauncher(scratch.path)
    const home = join(scratch.path, 'home')
    mkdirSync(home, { mode: 0o700 })
    chownSync(home, account.uid, account.gid)
    const { child, url, pid } = await launch(
      launcher,
      { directory: join(home, 'state'), settings: lightSettings, native },
      { ...account, env: { HOME: home, PATH: process.env['PATH'] } },
    )
    const client = new pg.Client({ connectionString: url })
    await client.connect()
    expect((await client.query('SELECT 1 AS one')).rows).toEqual([{ one: 1 }])
    await client.end()
    expect(statSync(join(home, 'state', 'postgresql', 'data')).uid).toBe(account.uid)
    expect(readFileSync(`/proc/${pid}/cmdline`, 'utf8')).toMatch(new RegExp(`^${home}/\\.cache/hedgerow/`))
    const exited = once(child, 'exit')
    child.kill('SIGKILL')
    await exited
    expect(await gone(pid)).toBe(true)
  })

  test('is told whose directory it cannot have', async () => {
    const launcher = writeLauncher(scratch.path)
    chmodSync(scratch.path, 0o755)
    mkdirSync(join(scratch.path, 'state'), { mode: 0o755 })
    mkdirSync(join(scratch.path, 'state', 'postgresql'), { mode: 0o700 })
    await expect(
      launch(launcher, { directory: join(scratch.path, 'state'), settings: lightSettings, native: packagedBinaries() }, { uid: 65534, gid: 65534 }),
    ).rejects.toThrow(/belongs to another account: start as its owner/)
  })
})
