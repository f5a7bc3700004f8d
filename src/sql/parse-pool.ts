import type { Worker } from 'node:worker_threads'
import { check, unreachable } from '../base/check.ts'
import { refuse } from '../base/refusal.ts'
import { startWorker } from './parse-worker.ts'
import type { Verdict } from './parse-worker.ts'

/** Parses one text after another in a thread of its own, with a second thread kept warm. */
export interface ParsePool {
  /** Refuses with text.too-deep what broke the parser or nests too deeply, with text.too-slow what did not end in time. */
  parse(text: string): Promise<Extract<Verdict, { readonly kind: 'parsed' | 'error' }>>
  close(): Promise<void>
}

export interface PoolLimits {
  /** Longest time for one text, counted from the moment a ready thread is given it. */
  readonly watchdogMs: number
  readonly stackSizeMb: number
  /** Deepest tree that is handed out, in levels of JSON. */
  readonly levels: number
}

/** A thread's verdict; 'late' where the watchdog did not wait for it, 'ended' where the thread was not there any more. */
type Answer = Verdict | { readonly kind: 'late' | 'ended' }

interface Job {
  readonly text: string
  readonly settle: (answer: Answer) => void
}

interface Thread {
  readonly worker: Worker
  /** Resolves when the thread can be asked, or is gone. */
  readonly ready: Promise<void>
}

/** Starts both threads. */
export function createPool(limits: PoolLimits): ParsePool {
  const waiting: Job[] = []
  let active = start(limits)
  let spare = start(limits)
  let busy = false
  let closed = false

  /** A thread that failed is never used again: the spare takes over. */
  function replace(): void {
    void active.worker.terminate()
    active = spare
    spare = start(limits)
  }

  async function work(): Promise<void> {
    if (busy) return
    busy = true
    for (let job = waiting.shift(); job !== undefined; job = waiting.shift()) {
      const answer = await ask(active, job.text, limits.watchdogMs)
      if (!closed && (answer.kind === 'broken' || answer.kind === 'late' || answer.kind === 'ended')) replace()
      job.settle(answer)
    }
    busy = false
  }

  return {
    async parse(text) {
      check(!closed, 'a closed parser is asked nothing')
      const answer = await new Promise<Answer>((settle) => {
        waiting.push({ text, settle })
        void work()
      })
      switch (answer.kind) {
        case 'parsed':
        case 'error':
          return answer
        case 'deep':
        case 'broken':
          return refuse('text.too-deep')
        case 'late':
        case 'ended':
          return refuse('text.too-slow')
        default:
          return unreachable(answer)
      }
    },
    async close() {
      closed = true
      await Promise.all([active.worker.terminate(), spare.worker.terminate()])
    },
  }
}

/** A thread does not keep the process alive while it has nothing to do. */
function start(limits: PoolLimits): Thread {
  const worker = startWorker(limits.stackSizeMb, limits.levels)
  worker.unref()
  worker.on('error', () => undefined)
  const ready = new Promise<void>((resolve) => {
    worker.once('message', () => resolve())
    worker.once('exit', () => resolve())
  })
  return { worker, ready }
}

async function ask({ worker, ready }: Thread, text: string, watchdogMs: number): Promise<Answer> {
  worker.ref()
  await ready
  const answer = await new Promise<Answer>((resolve) => {
    const settle = (found: Answer): void => {
      clearTimeout(timer)
      worker.off('message', settle)
      worker.off('exit', ended)
      resolve(found)
    }
    const ended = (): void => settle({ kind: 'ended' })
    const timer = setTimeout(() => settle({ kind: 'late' }), watchdogMs)
    worker.on('message', settle)
    worker.on('exit', ended)
    if (worker.threadId === gone) ended()
    else worker.postMessage(text)
  })
  worker.unref()
  return answer
}

/** The threadId that Node gives a thread after its exit. */
const gone = -1
