import type { Charge } from '../budget/ledger.ts'
import type { PullRequest } from './ports.ts'

/** What an analyst may read back about the release just given: about the noise, never the values. */
export interface LastOutput {
  readonly output: string
  readonly mechanism: string
  readonly scale: string
  /** Decimal text; null where none could be stated. */
  readonly margin: string | null
  readonly confidence: string
  readonly groups: string
  readonly rows: string | null
  readonly charge: Charge
  /** ISO 8601: the instant of the debit. */
  readonly at: string
  readonly id: string
}

export interface LastAnswers {
  /** Blocks of one statement stand together; the next statement takes their place. */
  add(request: PullRequest, outputs: readonly LastOutput[]): void
  of(request: PullRequest): readonly LastOutput[]
}

const kept = 5000

export function createLastAnswers(): LastAnswers {
  const sessions = new Map<string, { readonly statement: string; readonly outputs: readonly LastOutput[] }>()
  const keyOf = (request: PullRequest): string => JSON.stringify([request.database, request.user, request.pid])
  return {
    add: (request, outputs) => {
      const key = keyOf(request)
      const before = sessions.get(key)
      sessions.delete(key)
      const [oldest] = sessions.keys()
      if (sessions.size >= kept && oldest !== undefined) sessions.delete(oldest)
      const same = before !== undefined && before.statement === request.statement
      sessions.set(key, { statement: request.statement, outputs: same ? [...before.outputs, ...outputs] : outputs })
    },
    of: (request) => sessions.get(keyOf(request))?.outputs ?? [],
  }
}
