import { execFileSync } from 'node:child_process'
import { join } from 'node:path'
import { startServer } from '../../src/embedded/server.ts'
import { scratchDirectory } from '../harness/server.ts'

/** What makes a server light enough to start many of. */
export const lightSettings = { fsync: 'off', shared_buffers: '16MB', io_method: 'sync' } as const

/** A state directory that a server has run in, to be copied instead of made again for each test. */
export interface MadeState {
  /** Puts a copy of it, owners and modes included, at `directory`, which must not exist yet. */
  copyTo(directory: string): void
  remove(): void
}

/** Makes one. */
export async function makeState(): Promise<MadeState> {
  const scratch = scratchDirectory('hedgerow-made')
  const made = join(scratch.path, 'state')
  await (await startServer({ directory: made, settings: lightSettings })).stop()
  return {
    copyTo: (directory) => void execFileSync('cp', ['-Rp', made, directory]),
    remove: () => scratch.remove(),
  }
}
