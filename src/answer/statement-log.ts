import type { PullRequest } from './ports.ts'

/** Which blocks of a running statement were already asked for: its later ones need not be held in reserve again. */
export interface StatementLog {
  /** Blocks still to come once `request` is paid, itself not counted. */
  remaining(request: PullRequest): number
  paid(request: PullRequest): void
}

const kept = 5000

export function createStatementLog(): StatementLog {
  const statements = new Map<string, Set<string>>()
  const keyOf = (request: PullRequest): string => JSON.stringify([request.database, request.user, request.pid, request.statement, request.siblings])
  return {
    remaining: (request) => {
      const paid = statements.get(keyOf(request))?.size ?? 0
      return Math.max(0, request.siblings.length - 1 - paid)
    },
    paid: (request) => {
      const key = keyOf(request)
      const [oldest] = statements.keys()
      if (statements.size >= kept && oldest !== undefined && !statements.has(key)) statements.delete(oldest)
      statements.set(key, (statements.get(key) ?? new Set()).add(request.text))
    },
  }
}

/** How many equal shares a statement's epsilon is split into. */
export function sharesOf(request: PullRequest): number {
  return request.siblings.includes(request.text) ? request.siblings.length : 1
}
