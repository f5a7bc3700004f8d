import type { Slots } from '../answer/give.ts'

/** A fixed number of places, handed out in the order in which they are asked for. */
export function createSlots(places: number): Slots {
  let free = places
  const waiting: (() => void)[] = []
  const giveBack = (): void => {
    const next = waiting.shift()
    if (next === undefined) free += 1
    else next()
  }
  return {
    take: async signal => {
      signal.throwIfAborted()
      if (free > 0) free -= 1
      else
        await new Promise<void>((resolve, reject) => {
          const abort = (): void => {
            const at = waiting.indexOf(next)
            if (at >= 0) waiting.splice(at, 1)
            reject(signal.reason as Error)
          }
          const next = (): void => {
            signal.removeEventListener('abort', abort)
            resolve()
          }
          waiting.push(next)
          signal.addEventListener('abort', abort, { once: true })
        })
      let held = true
      return () => {
        if (held) giveBack()
        held = false
      }
    },
  }
}
