import type { Fraction } from '../base/fraction.ts'
import { epsilonSpent, spentOf } from '../budget/left.ts'
import type { Balance, Ledger } from '../budget/ledger.ts'
import type { DataSet, Policies, PrivateTable } from '../policy/data-set.ts'
import { accountsOf } from './accounts.ts'
import { defaultStatementsLeft } from './default-statements.ts'
import type { LastOutput } from './last-answers.ts'
import type { PullRequest } from './ports.ts'
import { typedName } from '../plan/names.ts'

type Row = Readonly<Record<string, string | null>>

function row(values: readonly (string | null)[]): Row {
  return Object.fromEntries(values.map((value, i) => [`c${(i + 1).toString()}`, value]))
}

/** Spent amounts, exact within the ledger's units and rounded up. */
function amount(value: Fraction, places = 20): string {
  const text = value.toDecimal(places, 'up')
  return text.includes('.') ? text.replace(/\.?0+$/, '') : text
}

/** Rows of hedgerow.budget: the analyst's own account and everyone's. */
export async function budgetRows(request: PullRequest, dataSet: DataSet, policies: Policies, ledger: Ledger): Promise<readonly Row[]> {
  const accounts = accountsOf(policies, dataSet, request.user)
  const balances = await ledger.balances([accounts.analyst, accounts.everyone])
  return balances.map((balance) => budgetRow(balance, dataSet, balance.account === accounts.analyst.id ? request.user : 'everyone'))
}

function budgetRow(balance: Balance, dataSet: DataSet, name: string): Row {
  const spent = spentOf(balance)
  const { cap } = balance
  return row([
    name,
    balance.period,
    amount(cap.epsilon),
    amount(cap.delta),
    balance.epsilonSpent === null ? null : amount(balance.epsilonSpent, 12),
    cap.rhoCap.toDecimal(15, 'down'),
    amount(balance.rhoSpent, 15),
    amount(balance.deltaSpent),
    defaultStatementsLeft(balance, dataSet).toString(),
    amount(balance.rhoEver, 15),
    noteOf(balance, epsilonSpent(cap, spent)),
  ])
}

function noteOf(balance: Balance, epsilon: Fraction | null): string {
  const tracks = balance.epsilonSpent === null ? 'Gaussian noise was used: the rho track counts' : 'both tracks are open: a statement must fit one of them'
  const reading =
    epsilon === null ? '' : `; spending so far amounts to epsilon ${amount(epsilon, 6)} at the cap’s delta (for information: the cap is the guarantee)`
  const renewed = balance.cap.renews === 'never' ? '' : `; renewed each ${balance.cap.renews}: loss adds up over the periods, see loss_over_all_periods (rho)`
  return `${tracks}${reading}${renewed}`
}

/** Rows of hedgerow.charges, latest first. */
export async function chargesRows(request: PullRequest, ledger: Ledger): Promise<readonly Row[]> {
  const entries = await ledger.charges(request.user, request.database, 1000)
  return entries.map((entry) => {
    const tables = entry.note.release['tables']
    const totals = entry.note.release['totals']
    const mechanisms = Array.isArray(totals) ? [...new Set(totals.map((total) => mechanismOf(total)))].join(', ') : ''
    return row([
      entry.at,
      entry.charge.epsilon === null ? null : amount(entry.charge.epsilon, 12),
      amount(entry.charge.rho, 15),
      amount(entry.charge.delta),
      mechanisms,
      Array.isArray(tables) ? tables.join(', ') : '',
      entry.note.application,
      entry.id,
    ])
  })
}

function mechanismOf(total: unknown): string {
  return typeof total === 'object' && total !== null && 'mechanism' in total && typeof total.mechanism === 'string' ? total.mechanism : ''
}

/** Rows of hedgerow.last_answer: one an output. */
export function lastAnswerRows(outputs: readonly LastOutput[]): readonly Row[] {
  return outputs.map((each) =>
    row([
      each.output,
      each.mechanism,
      each.scale,
      each.margin,
      each.confidence,
      each.groups,
      each.rows,
      each.charge.epsilon === null ? null : amount(each.charge.epsilon, 12),
      amount(each.charge.rho, 15),
      amount(each.charge.delta),
      each.at,
      each.id,
    ]),
  )
}

/** Rows of hedgerow.bounds: what the policy declares, a row a table and a row a column. */
export function boundsRows(dataSet: DataSet): readonly Row[] {
  return [...dataSet.tables.values()].flatMap((table): readonly Row[] => {
    const name = typedName(dataSet, table)
    if (table.kind === 'published') return [row([name, null, 'published: a copy stands in the lobby, free to read', null, null, null, null, null, null])]
    const head = row([name, null, ownerText(table, dataSet), table.bounds.groups.toString(), table.bounds.rows.toString(), null, null, null, null])
    return [
      head,
      ...[...table.columns.values()].map((column) =>
        row([
          name,
          column.name,
          column.role === 'linking' ? 'says whose row it is: for joins and distinct counts' : column.type.printed,
          null,
          null,
          column.clamp?.[0] ?? null,
          column.clamp?.[1] ?? null,
          column.step,
          keysText(column),
        ]),
      ),
    ]
  })
}

function ownerText(table: PrivateTable, dataSet: DataSet): string {
  const way = table.owner.kind === 'column' ? table.owner.column : table.owner.steps.map((step) => step.table).join(', ')
  return `each row belongs to one ${dataSet.personCalled}, by ${way}${table.onePerPerson ? '; one row each' : ''}`
}

function keysText(column: {
  readonly values: readonly string[] | null
  readonly valuesFrom: { readonly table: string; readonly column: string } | null
  readonly type: { readonly name: string }
}): string | null {
  if (column.values !== null) return column.values.join(', ')
  if (column.valuesFrom !== null) return `those of ${column.valuesFrom.table}.${column.valuesFrom.column}`
  return column.type.name === 'bool' ? 'true, false' : null
}
