/** Chi-square of draws against an exact law on the integers: one cell for each k with |k| <= reach, one for either tail. */
export function chiSquare(
  draws: readonly bigint[],
  probability: (k: number) => number,
  reach: number,
): { readonly statistic: number; readonly critical: number } {
  const counts = new Array<number>(2 * reach + 3).fill(0)
  for (const draw of draws) {
    const k = Math.max(-reach - 1, Math.min(reach + 1, Number(draw)))
    counts[k + reach + 1]! += 1
  }
  const inner = Array.from({ length: 2 * reach + 1 }, (_, i) => probability(i - reach))
  const tail = (1 - inner.reduce((a, b) => a + b, 0)) / 2
  const expected = [tail, ...inner, tail].map((p) => p * draws.length)
  if (Math.min(...expected) < 5) throw new Error('a cell expects fewer than 5 draws')
  const statistic = expected.reduce((sum, e, i) => sum + (counts[i]! - e) ** 2 / e, 0)
  return { statistic, critical: criticalAt(expected.length - 1) }
}

/** The value that chi-square of `degrees` exceeds once in a thousand (Wilson & Hilferty 1931). */
export function criticalAt(degrees: number): number {
  const spread = 2 / (9 * degrees)
  return degrees * (1 - spread + 3.0902 * Math.sqrt(spread)) ** 3
}
