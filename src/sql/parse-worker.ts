import { createRequire } from 'node:module'
import { Worker } from 'node:worker_threads'

/** What a parser thread says about one text. */
export type Verdict =
  | { readonly kind: 'parsed'; readonly json: string }
  | { readonly kind: 'error'; readonly message: string; readonly at: number }
  /** The instance may be broken and must not be used again. */
  | { readonly kind: 'broken' }

/**
 * The thread's program, plain JavaScript so that it runs alike from sources and from the built program. It holds one WebAssembly instance of PostgreSQL's
 * parser and answers text with JSON. `at` counts characters, as PostgreSQL does.
 */
const program = `
  const { parentPort, workerData } = require('node:worker_threads')
  const parser = require(workerData)
  parser.loadModule().then(() => {
    parser.parseSync('SELECT 1')
    parentPort.on('message', (text) => parentPort.postMessage(judge(text)))
    parentPort.postMessage('ready')
  })
  function judge(text) {
    try {
      return { kind: 'parsed', json: JSON.stringify(parser.parseSync(text)) }
    } catch (error) {
      if (error instanceof parser.SqlError && error.sqlDetails !== undefined) {
        return { kind: 'error', message: error.message, at: error.sqlDetails.cursorPosition }
      }
      return { kind: 'broken' }
    }
  }
`

const parserPath = createRequire(import.meta.url).resolve('libpg-query')

/** Starts a parser thread. It says 'ready' once, then answers each text with one Verdict, in order. */
export function startWorker(stackSizeMb: number): Worker {
  return new Worker(program, { eval: true, workerData: parserPath, resourceLimits: { stackSizeMb }, env: {}, execArgv: [] })
}
