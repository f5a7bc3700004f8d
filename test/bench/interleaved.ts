/** Times several ways of doing the same in turn, so that what disturbs the machine disturbs all of them alike. Milliseconds, the median of `rounds`. */
export async function interleaved<Name extends string>(
  rounds: number,
  ways: Readonly<Record<Name, () => Promise<unknown>>>,
): Promise<Readonly<Record<Name, number>>> {
  const entries = Object.entries(ways) as [Name, () => Promise<unknown>][]
  const times = new Map<Name, number[]>(entries.map(([name]) => [name, []]))
  for (const [, way] of entries) await way()
  for (let round = 0; round < rounds; round++) {
    for (const [name, way] of round % 2 === 0 ? entries : entries.toReversed()) {
      const start = performance.now()
      await way()
      times.get(name)?.push(performance.now() - start)
    }
  }
  return Object.fromEntries([...times].map(([name, all]) => [name, median(all)])) as Record<Name, number>
}

function median(values: readonly number[]): number {
  const sorted = values.toSorted((a, b) => a - b)
  const middle = Math.floor(sorted.length / 2)
  return sorted.length % 2 === 1 ? (sorted[middle] ?? 0) : ((sorted[middle - 1] ?? 0) + (sorted[middle] ?? 0)) / 2
}

/** One line of a report: what, the ratio, and the two times behind it. */
export function ratioLine(what: string, own: number, base: number): string {
  return `${what.padEnd(72)} ${(own / base).toFixed(2).padStart(6)} ×   ${own.toFixed(2).padStart(8)} ms against ${base.toFixed(2).padStart(8)} ms`
}
