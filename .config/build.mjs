/** Builds src into dist: always, or with --if-stale only where a source or a setting of the compiler is newer than the last build. */
import { execFileSync } from 'node:child_process'
import { existsSync, readdirSync, renameSync, rmSync, statSync } from 'node:fs'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'

const root = fileURLToPath(new URL('..', import.meta.url))
const dist = join(root, 'dist')

if (!process.argv.includes('--if-stale') || stale()) build()

function stale() {
  if (!existsSync(dist)) return true
  const built = statSync(dist).mtimeMs
  const sources = readdirSync(join(root, 'src'), { recursive: true, encoding: 'utf8' }).map((name) => join(root, 'src', name))
  return [join(root, 'src'), ...sources, join(root, 'tsconfig.json'), join(root, '.config', 'tsconfig.build.json')].some(
    (file) => statSync(file).mtimeMs > built,
  )
}

/** Compiled beside dist and put in its place when it is whole: a broken build leaves the last good one. */
function build() {
  const fresh = join(root, `dist.new.${process.pid}`)
  try {
    execFileSync(process.execPath, [join(root, 'node_modules/typescript/bin/tsc'), '-p', join(root, '.config/tsconfig.build.json'), '--outDir', fresh], {
      stdio: 'inherit',
    })
    rmSync(dist, { recursive: true, force: true })
    renameSync(fresh, dist)
  } catch {
    process.exitCode = 1
  } finally {
    rmSync(fresh, { recursive: true, force: true })
  }
}
