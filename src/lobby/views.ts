import { literal, name } from './quote.ts'

interface LobbyView {
  readonly name: 'budget' | 'charges' | 'last_answer' | 'bounds'
  readonly comment: string
  /** In the order of the reply's c1, c2, …: the reply carries text. */
  readonly columns: readonly (readonly [name: string, type: string])[]
}

/** What an analyst can look up about the own account and the policy; each reads hedgerow.read(<name>), which answers for session_user only. */
export const lobbyViews: readonly LobbyView[] = [
  {
    name: 'budget',
    comment: 'what you may spend, have spent and have left',
    columns: [
      ['account', 'text'],
      ['period', 'text'],
      ['epsilon_cap', 'numeric'],
      ['delta_cap', 'numeric'],
      ['epsilon_spent', 'numeric'],
      ['rho_cap', 'numeric'],
      ['rho_spent', 'numeric'],
      ['delta_spent', 'numeric'],
      ['default_statements_left', 'bigint'],
      ['loss_over_all_periods', 'numeric'],
      ['note', 'text'],
    ],
  },
  {
    name: 'charges',
    comment: 'your debits, latest first',
    columns: [
      ['at', 'timestamptz'],
      ['epsilon', 'numeric'],
      ['rho', 'numeric'],
      ['delta', 'numeric'],
      ['mechanism', 'text'],
      ['tables', 'text'],
      ['application', 'text'],
      ['id', 'text'],
    ],
  },
  {
    name: 'last_answer',
    comment: 'your last release: one row per output',
    columns: [
      ['output', 'text'],
      ['mechanism', 'text'],
      ['scale', 'text'],
      ['margin', 'numeric'],
      ['confidence', 'numeric'],
      ['groups_per_person', 'bigint'],
      ['rows_per_group', 'bigint'],
      ['epsilon', 'numeric'],
      ['rho', 'numeric'],
      ['delta', 'numeric'],
      ['released_at', 'timestamptz'],
      ['id', 'text'],
    ],
  },
  {
    name: 'bounds',
    comment: 'what the policy declares of each table and column',
    columns: [
      ['table_name', 'text'],
      ['column_name', 'text'],
      ['facts', 'text'],
      ['groups', 'bigint'],
      ['rows', 'bigint'],
      ['clamp_low', 'text'],
      ['clamp_high', 'text'],
      ['step', 'text'],
      ['keys', 'text'],
    ],
  },
]

/** A security_barrier view: no function of the reader's runs before the view's own rows are made. */
export function viewText(view: LobbyView): string {
  const outputs = view.columns.map(([column], at) => `r.c${at + 1} AS ${name(column)}`).join(', ')
  const types = view.columns.map(([, type], at) => `c${at + 1} pg_catalog.${type === 'bigint' ? 'int8' : type}`).join(', ')
  return `CREATE VIEW hedgerow.${name(view.name)} WITH (security_barrier = true) AS
    SELECT ${outputs} FROM pg_catalog.jsonb_to_recordset(hedgerow.read(${literal(view.name)})) AS r(${types})`
}
