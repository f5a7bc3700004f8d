import type { Slots } from '../answer/give.ts'

interface Waiting {
  readonly owner: string
  readonly go: () => void
}

/**
 * A fixed number of places. One owner holds `each` of them at the most, and whoever holds fewer goes first: many sessions of one analyst cannot keep another's out.
 */
export function createSlots(places: number, each: number): Slots {
  const held = new Map<string, number>()
  const waiting: Waiting[] = []
  let free = places
  const heldBy = (owner: string): number => held.get(owner) ?? 0
  const takes = (owner: string): void => {
    free -= 1
    held.set(owner, heldBy(owner) + 1)
  }
  const next = (): void => {
    if (free === 0) return
    const [first] = waiting.filter(({ owner }) => heldBy(owner) < each).toSorted((a, b) => heldBy(a.owner) - heldBy(b.owner))
    if (first === undefined) return
    waiting.splice(waiting.indexOf(first), 1)
    takes(first.owner)
    first.go()
  }
  const giveBack = (owner: string): void => {
    free += 1
    if (heldBy(owner) === 1) held.delete(owner)
    else held.set(owner, heldBy(owner) - 1)
    next()
  }
  return {
    take: async (owner, signal) => {
      signal.throwIfAborted()
      if (free > 0 && heldBy(owner) < each) takes(owner)
      else
        await new Promise<void>((resolve, reject) => {
          const abort = (): void => {
            const at = waiting.indexOf(place)
            if (at >= 0) waiting.splice(at, 1)
            reject(signal.reason as Error)
          }
          const place: Waiting = {
            owner,
            go: () => {
              signal.removeEventListener('abort', abort)
              resolve()
            },
          }
          waiting.push(place)
          signal.addEventListener('abort', abort, { once: true })
        })
      let holds = true
      return () => {
        if (holds) giveBack(owner)
        holds = false
      }
    },
  }
}
