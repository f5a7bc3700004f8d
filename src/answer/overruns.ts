import type { Log } from '../base/ports.ts'

/** Replies that were not ready at their own instant, by account: each tells a little about how long the rows took. */
export interface Overruns {
  count(account: string, at: number): void
  isPaused(account: string, at: number): boolean
}

const windowMs = 86_400_000

/** An account is paused while it has more than `most` overruns within a day. */
export function createOverruns(most: number, log: Log): Overruns {
  const times = new Map<string, readonly number[]>()
  const recent = (account: string, at: number): readonly number[] => (times.get(account) ?? []).filter((time) => time > at - windowMs)
  return {
    count: (account, at) => {
      const all = [...recent(account, at), at]
      times.set(account, all)
      log('warn', 'answer.overrun', { account, within_the_day: all.length })
    },
    isPaused: (account, at) => recent(account, at).length > most,
  }
}
