/** ln 2 and pi in fixed point, computed once for each precision asked for and kept. */

const guard = 32n
const kept = new Map<string, { readonly bits: bigint; readonly value: bigint }>()

/** ln 2 * 2^bits, off by less than 2. */
export function fixedLn2(bits: bigint): bigint {
  return fixed('ln2', bits, (p) => 18n * inverseSeries(26n, p, 1n) - 2n * inverseSeries(4801n, p, 1n) + 8n * inverseSeries(8749n, p, 1n))
}

/** pi * 2^bits, off by less than 2. */
export function fixedPi(bits: bigint): bigint {
  return fixed('pi', bits, (p) => 16n * inverseSeries(5n, p, -1n) - 4n * inverseSeries(239n, p, -1n))
}

function fixed(name: string, bits: bigint, compute: (bits: bigint) => bigint): bigint {
  let entry = kept.get(name)
  if (entry === undefined || entry.bits < bits + guard) {
    const ample = bits + guard + 256n
    entry = { bits: ample, value: compute(ample) }
    kept.set(name, entry)
  }
  return entry.value >> (entry.bits - bits)
}

/** artanh(1/n) for sign 1, arctan(1/n) for sign -1, times 2^bits: one unit lost a term, far below the guard. */
function inverseSeries(n: bigint, bits: bigint, sign: 1n | -1n): bigint {
  let power = (1n << bits) / n
  let sum = 0n
  let term = 1n
  for (let k = 1n; power !== 0n; k += 2n) {
    sum += (term * power) / k
    power /= n * n
    term *= sign
  }
  return sum
}
