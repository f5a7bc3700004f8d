import { randomBytes } from 'node:crypto'

/** Why an answer could not be given after rows may have been read: a closed list, so that nothing of the rows can be in it. */
export type FailureCode = 'deadline' | 'vault' | 'ledger' | 'internal'

/**
 * What went wrong after rows may have been read. It carries a code and a reference that the operator finds in the log, never a text of the vault:
 * a server's message can quote a person's value.
 */
export class Failure extends Error {
  override readonly name = 'Failure'
  readonly code: FailureCode
  readonly reference: string
  constructor(code: FailureCode) {
    const reference = randomBytes(4).toString('hex')
    super(`${code} ${reference}`)
    this.code = code
    this.reference = reference
  }
}
