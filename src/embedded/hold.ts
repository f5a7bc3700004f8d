import { randomUUID } from 'node:crypto'
import { link, readdir, readFile, rm, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { EmbeddedServerError } from './embedded-error.ts'
import { processIdentity } from './processes.ts'

/** The sole right to a directory, until released or until this process is gone. */
export interface Hold {
  release(): Promise<void>
}

/**
 * Takes `directory` for this process, or says who has it. A holder that is gone is succeeded.
 *
 * INVARIANT HOLD: the holder is the process named in the file `holder.N` of the highest N. A successor makes N + 1 by an exclusive link, so of several only one succeeds, and
 * nobody ever removes the highest file of another.
 */
export async function holdDirectory(directory: string): Promise<Hold> {
  const identity = await processIdentity(process.pid)
  for (;;) {
    const last = highest(await readdir(directory))
    if (last > 0) await refuseLiving(directory, last)
    if (!(await claimed(directory, last + 1, identity ?? String(process.pid)))) continue
    const entries = await readdir(directory)
    if (highest(entries) !== last + 1) {
      await rm(holderFile(directory, last + 1), { force: true })
      continue
    }
    await Promise.all(entries.filter((name) => generation(name) > 0 && generation(name) <= last).map((name) => rm(join(directory, name), { force: true })))
    return { release: async () => await writeFile(holderFile(directory, last + 1), '') }
  }
}

async function refuseLiving(directory: string, last: number): Promise<void> {
  const holder = await readFile(holderFile(directory, last), 'utf8').catch(() => '')
  const pid = Number.parseInt(holder, 10)
  if (!Number.isInteger(pid) || (await processIdentity(pid)) !== holder) return
  throw new EmbeddedServerError(
    `the state directory ${directory} is in use by process ${pid}`,
    'stop that one first, or set HEDGEROW_STATE to another directory',
  )
}

async function claimed(directory: string, next: number, identity: string): Promise<boolean> {
  const draft = join(directory, `draft.${randomUUID()}`)
  await writeFile(draft, identity, { flag: 'wx', mode: 0o600 })
  try {
    await link(draft, holderFile(directory, next))
    return true
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'EEXIST') return false
    throw error
  } finally {
    await rm(draft, { force: true })
  }
}

function holderFile(directory: string, generationNumber: number): string {
  return join(directory, `holder.${generationNumber}`)
}

function highest(names: readonly string[]): number {
  return names.map(generation).reduce((most, one) => (one > most ? one : most), 0)
}

function generation(name: string): number {
  return /^holder\.[1-9]\d{0,14}$/.test(name) ? Number(name.slice('holder.'.length)) : 0
}
