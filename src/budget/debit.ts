import { BrokenCheck, check } from '../base/check.ts'
import type { DebitOutcome } from './ledger.ts'

const key = Symbol('debit')
const turned = new WeakSet<object>()

/**
 * Proof that a release was paid for. INVARIANT DEBITED: made from a ledger's 'debited' outcome only, once for each, and used once; the release step demands
 * one.
 */
export class Debit {
  readonly #id: string
  #used = false

  constructor(maker: symbol, id: string) {
    check(maker === key, 'a debit is made from a ledger outcome only')
    this.#id = id
  }

  /** The ledger's id of the debit; a BrokenCheck the second time. */
  use(): string {
    check(!this.#used, 'a debit pays for one release')
    this.#used = true
    return this.#id
  }

  toJSON(): never {
    throw new BrokenCheck('a debit is not printed')
  }

  [Symbol.toPrimitive](): never {
    throw new BrokenCheck('a debit is not printed')
  }
}

/** Turns the ledger's outcome into the debit it stands for; a BrokenCheck for an outcome that was turned before, or that debited nothing. */
export function debitFrom(outcome: Extract<DebitOutcome, { readonly kind: 'debited' }>): Debit {
  check(outcome.kind === 'debited' && !turned.has(outcome), 'an outcome makes one debit')
  turned.add(outcome)
  return new Debit(key, outcome.id)
}
