import { createRequire } from 'node:module'
import { Worker } from 'node:worker_threads'

/** What a parser thread says about one text. */
export type Verdict =
  | { readonly kind: 'parsed'; readonly json: string }
  | { readonly kind: 'error'; readonly message: string; readonly at: number }
  /** The tree has more levels than our own recursion is given. */
  | { readonly kind: 'deep' }
  /** The instance may be broken and must not be used again. */
  | { readonly kind: 'broken' }

/**
 * The thread's program, plain JavaScript so that it runs alike from sources and from the built program. It holds one WebAssembly instance of PostgreSQL's
 * parser and answers text with JSON. `at` counts characters, as PostgreSQL does.
 *
 * The parser package turns the JSON text into objects, which we would only write again, at a cost that grows with the square of their depth: in this
 * thread JSON.parse hands the text through.
 */
const program = `
  const { parentPort, workerData } = require('node:worker_threads')
  const parser = require(workerData.path)
  JSON.parse = (text) => text
  parser.loadModule().then(() => {
    judge('SELECT 1')
    parentPort.on('message', (text) => parentPort.postMessage(judge(text)))
    parentPort.postMessage('ready')
  })
  function judge(text) {
    try {
      const json = parser.parseSync(text)
      return levels(json) > workerData.levels ? { kind: 'deep' } : { kind: 'parsed', json }
    } catch (error) {
      if (error instanceof parser.SqlError && error.sqlDetails !== undefined) {
        return { kind: 'error', message: error.message, at: error.sqlDetails.cursorPosition }
      }
      return { kind: 'broken' }
    }
  }
  function levels(json) {
    let depth = 0
    let deepest = 0
    for (let at = 0; at < json.length; at += 1) {
      const code = json.charCodeAt(at)
      if (code === 34) {
        do at = json.indexOf('"', at + 1)
        while (isEscaped(json, at))
      } else if (code === 123 || code === 91) {
        depth += 1
        if (depth > deepest) deepest = depth
      } else if (code === 125 || code === 93) depth -= 1
    }
    return deepest
  }
  function isEscaped(json, at) {
    let slashes = 0
    while (json.charCodeAt(at - 1 - slashes) === 92) slashes += 1
    return slashes % 2 === 1
  }
`

const require = createRequire(import.meta.url)
const path = require.resolve('libpg-query')

/** Starts a parser thread. It says 'ready' once, then answers each text with one Verdict, in order. `levels` is the deepest tree it hands out. */
export function startWorker(stackSizeMb: number, levels: number): Worker {
  return new Worker(program, { eval: true, workerData: { path, levels }, resourceLimits: { stackSizeMb }, env: {}, execArgv: [] })
}
