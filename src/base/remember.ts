/** A pure function of a text key that keeps its latest results, `ceiling` of them at the most: the oldest goes first. */
export function remember<Value>(ceiling: number): (key: string, compute: () => Value) => Value {
  const kept = new Map<string, { readonly value: Value }>()
  return (key, compute) => {
    const found = kept.get(key)
    if (found !== undefined) return found.value
    const value = compute()
    if (kept.size >= ceiling)
      for (const oldest of kept.keys()) {
        kept.delete(oldest)
        break
      }
    kept.set(key, { value })
    return value
  }
}
