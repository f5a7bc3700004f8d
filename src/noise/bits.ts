import { check } from '../base/check.ts'
import type { RandomBytes } from '../base/ports.ts'

const batchBytes = 4096

/** Uniform integers from a port of random bytes, fetched in batches; every byte is used once at the most. */
export class BitSource {
  readonly #random: RandomBytes
  #batch: Uint8Array = new Uint8Array(0)
  #next = 0

  constructor(random: RandomBytes) {
    this.#random = random
  }

  /** Uniform over [0, n), n > 0: as many whole bytes as n - 1 needs, the surplus high bits cut off, drawn again while not below n. */
  below(n: bigint): bigint {
    check(n > 0n, 'a uniform draw needs a positive bound')
    if (n === 1n) return 0n
    if (n <= 256n) return this.#belowByte(n)
    const top = n - 1n
    const bytes = BigInt((top.toString(16).length + 1) >> 1)
    const mask = maskOver(top)
    for (;;) {
      const drawn = this.#bytes(bytes) & mask
      if (drawn < n) return drawn
    }
  }

  #belowByte(n: bigint): bigint {
    const mask = maskOver(n - 1n)
    for (;;) {
      const drawn = BigInt(this.#byte()) & mask
      if (drawn < n) return drawn
    }
  }

  /** The first byte drawn is the most significant. */
  #bytes(count: bigint): bigint {
    let value = 0n
    for (let i = 0n; i < count; i++) value = (value << 8n) | BigInt(this.#byte())
    return value
  }

  #byte(): number {
    if (this.#next === this.#batch.length) {
      this.#batch = this.#random(batchBytes)
      this.#next = 0
      check(this.#batch.length === batchBytes, 'the random source gave another number of bytes')
    }
    const byte = this.#batch[this.#next]
    check(byte !== undefined, 'the batch ends where its length says')
    this.#batch[this.#next++] = 0
    return byte
  }
}

/** All ones over the bits of a positive integer. */
function maskOver(top: bigint): bigint {
  let mask = top
  for (let shift = 1n; mask >> shift !== 0n; shift <<= 1n) mask |= mask >> shift
  return mask
}
