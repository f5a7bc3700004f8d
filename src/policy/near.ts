/** The known name most like `name`, or null where none is near enough to be meant. */
export function nearest(name: string, known: Iterable<string>): string | null {
  const ceiling = name.length <= 3 ? 1 : name.length <= 6 ? 2 : 3
  let best: string | null = null
  let bestDistance = ceiling + 1
  for (const candidate of known) {
    if (Math.abs(candidate.length - name.length) > ceiling) continue
    const distance = edits(name.toLowerCase(), candidate.toLowerCase())
    if (distance < bestDistance) [best, bestDistance] = [candidate, distance]
  }
  return best
}

/** A remedy that offers the nearest known name, or else lists what there is. */
export function didYouMean(name: string, known: readonly string[], otherwise: string): string {
  const near = nearest(name, known)
  if (near !== null) return `did you mean ${near}?`
  if (known.length === 0) return otherwise
  const shown = known.slice(0, 12).join(', ')
  return `${otherwise}; there is ${shown}${known.length > 12 ? ', …' : ''}`
}

/** Insertions, deletions and exchanges of one letter, and swaps of two neighbours (Damerau 1964, in the restricted form). */
function edits(a: string, b: string): number {
  let before: number[] = []
  let last = Array.from({ length: b.length + 1 }, (_, j) => j)
  for (let i = 1; i <= a.length; i++) {
    const row = [i]
    for (let j = 1; j <= b.length; j++) {
      const same = a[i - 1] === b[j - 1]
      let cost = Math.min((last[j] ?? 0) + 1, (row[j - 1] ?? 0) + 1, (last[j - 1] ?? 0) + (same ? 0 : 1))
      if (i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1]) cost = Math.min(cost, (before[j - 2] ?? 0) + 1)
      row.push(cost)
    }
    before = last
    last = row
  }
  return last[b.length] ?? 0
}
