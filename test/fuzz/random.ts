/** A small generator of repeatable choices (xorshift32): the same seed gives the same cases on every machine. */
export interface Random {
  /** A whole number from 0 to n - 1. */
  below(n: number): number
  chance(probability: number): boolean
  pick<T>(list: readonly T[]): T
  /** A signed 64-bit salt. */
  readonly salt: () => bigint
}

export function seeded(seed: number): Random {
  let state = Math.imul(seed ^ 0x9e3779b9, 0x85ebca6b) | 1
  const next = (): number => {
    state ^= state << 13
    state ^= state >>> 17
    state ^= state << 5
    return state >>> 0
  }
  for (let i = 0; i < 8; i += 1) next()
  const below = (n: number): number => next() % n
  return {
    below,
    chance: (probability) => next() < probability * 2 ** 32,
    pick: (list) => {
      const found = list[below(list.length)]
      if (found === undefined) throw new RangeError('nothing to pick from')
      return found
    },
    salt: () => BigInt.asIntN(64, (BigInt(next()) << 32n) | BigInt(next())),
  }
}
