/**
 * Builds what is out of date, then runs an entry of dist in this very process: `node .config/start.mjs demo/main.js --once`. A shell in between would answer a
 * Ctrl-C by ending with the signal, however cleanly the program ended.
 */
import { spawnSync } from 'node:child_process'
import { fileURLToPath, pathToFileURL } from 'node:url'

const [node, , entry = '', ...args] = process.argv
const { status } = spawnSync(node, [fileURLToPath(new URL('build.mjs', import.meta.url)), '--if-stale'], { stdio: 'inherit' })
if (status === 0) {
  const program = fileURLToPath(new URL(`../dist/${entry}`, import.meta.url))
  process.argv = [node, program, ...args]
  await import(pathToFileURL(program).href)
} else process.exitCode = status ?? 1
