import { createHash } from 'node:crypto'
import type { RandomBytes } from '../../src/base/ports.ts'

/** Reproducible bytes: SHA-256 of a seed and a counter. */
export function seededBytes(seed: string): RandomBytes {
  let counter = 0
  return (count) => {
    const blocks: Buffer[] = []
    for (let length = 0; length < count; length += 32) blocks.push(createHash('sha256').update(`${seed} ${counter++}`).digest())
    return new Uint8Array(Buffer.concat(blocks).subarray(0, count))
  }
}

/** The given bytes, then an endless 0, 1, 2, … of every value, so that no draw waits for ever. */
export function givenBytes(...bytes: readonly number[]): RandomBytes {
  let next = 0
  return (count) => Uint8Array.from({ length: count }, () => bytes[next++] ?? (next * 37) % 256)
}
