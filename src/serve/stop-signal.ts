/** npm hands a terminal's Ctrl-C on once more to what it runs: a second signal this soon is the first one again. */
const sameMs = 1_000

/** Calls `stop` at the first SIGINT or SIGTERM. Another one later ends the process at once, for whoever will not wait. */
export function onStopSignal(stop: (signal: string) => void): void {
  let first: number | null = null
  for (const signal of ['SIGINT', 'SIGTERM'] as const) {
    process.on(signal, () => {
      const now = Date.now()
      if (first === null) {
        first = now
        stop(signal)
      } else if (now - first > sameMs) process.exit(1)
    })
  }
}
