import { randomBytes } from 'node:crypto'
import type { Clock, Log, RandomBytes } from '../base/ports.ts'

/** The machine's clock. */
export const systemClock: Clock = {
  now: () => Date.now(),
  until: (atMs, signal) =>
    new Promise((resolve, reject) => {
      if (signal?.aborted === true) return reject(signal.reason as Error)
      const abort = (): void => {
        clearTimeout(timer)
        reject(signal?.reason as Error)
      }
      const timer = setTimeout(
        () => {
          signal?.removeEventListener('abort', abort)
          resolve()
        },
        Math.max(0, atMs - Date.now()),
      )
      signal?.addEventListener('abort', abort, { once: true })
    }),
}

/** The system's generator: noise and salts come from nowhere else. */
export const systemRandom: RandomBytes = (count) => randomBytes(count)

/** One JSON object a line. */
export function lineLog(write: (line: string) => void): Log {
  return (level, event, fields = {}) => write(`${JSON.stringify({ at: new Date().toISOString(), level, event, ...fields })}\n`)
}
