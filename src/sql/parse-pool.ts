import type { Worker } from 'node:worker_threads'
import { check } from '../base/check.ts'
import { refuse } from '../base/refusal.ts'
import { startWorker } from './parse-worker.ts'
import type { Verdict } from './parse-worker.ts'

/** Parses one text after another in a thread of its own, with a second thread kept warm. */
export interface ParsePool {
  /** Refuses with text.too-deep what broke the parser or did not end in time. */
  parse(text: string): Promise<Verdict & { readonly kind: 'parsed' | 'error' }>
  close(): Promise<void>
}

interface Job {
  readonly text: string
  readonly settle: (verdict: Verdict) => void
}

interface Thread {
  readonly worker: Worker
  readonly ready: Promise<void>
}

/** `watchdogMs` counts from the moment a ready thread is given the text. */
export function createPool(watchdogMs: number, stackSizeMb: number): ParsePool {
  const waiting: Job[] = []
  let active = start(stackSizeMb)
  let spare = start(stackSizeMb)
  let busy = false
  let closed = false

  /** A thread that failed is never used again: the spare takes over. */
  function replace(): void {
    void active.worker.terminate()
    active = spare
    spare = start(stackSizeMb)
  }

  async function work(): Promise<void> {
    if (busy) return
    busy = true
    for (let job = waiting.shift(); job !== undefined; job = waiting.shift()) {
      const verdict = closed ? broken : await ask(active, job.text, watchdogMs)
      if (verdict.kind === 'broken' && !closed) replace()
      job.settle(verdict)
    }
    busy = false
  }

  return {
    async parse(text) {
      check(!closed, 'a closed parser is asked nothing')
      const verdict = await new Promise<Verdict>((settle) => {
        waiting.push({ text, settle })
        void work()
      })
      if (verdict.kind === 'broken') return refuse('text.too-deep')
      return verdict
    },
    async close() {
      closed = true
      await Promise.all([active.worker.terminate(), spare.worker.terminate()])
    },
  }
}

const broken: Verdict = { kind: 'broken' }

function start(stackSizeMb: number): Thread {
  const worker = startWorker(stackSizeMb)
  worker.unref()
  const ready = new Promise<void>((resolve) => {
    worker.once('message', () => resolve())
    worker.once('exit', () => resolve())
  })
  worker.on('error', () => undefined)
  return { worker, ready }
}

async function ask(thread: Thread, text: string, watchdogMs: number): Promise<Verdict> {
  const { worker } = thread
  worker.ref()
  await thread.ready
  const verdict = await new Promise<Verdict>((resolve) => {
    const timer = setTimeout(() => settle(broken), watchdogMs)
    const settle = (value: Verdict): void => {
      clearTimeout(timer)
      worker.off('message', settle)
      worker.off('exit', exited)
      resolve(value)
    }
    const exited = (): void => settle(broken)
    worker.on('message', settle)
    worker.on('exit', exited)
    worker.postMessage(text)
  })
  worker.unref()
  return verdict
}
