import { Fraction } from '../base/fraction.ts'
import { accountCap } from '../budget/cap.ts'
import type { Cap, DataSet, Owner, PrivateTable, Policies } from '../policy/data-set.ts'

/** What loaded policies amount to, as lines for whoever runs `hedgerow check`. */
export function summary(policies: Policies): readonly string[] {
  return [...policies.dataSets.values()].flatMap((dataSet) => dataSetLines(policies, dataSet))
}

function dataSetLines(policies: Policies, dataSet: DataSet): readonly string[] {
  const width = Math.max(...[...dataSet.tables.keys()].map((key) => key.length))
  const tables = [...dataSet.tables].map(
    ([key, table]) => `  ${key.padEnd(width)}  ${table.kind === 'published' ? `published, ${count(table.columns.size, 'column')}` : privateLine(table)}`,
  )
  const holders = [...policies.analysts.values()].flatMap((analyst) => {
    const cap = analyst.data.get(dataSet.name)
    return cap === undefined ? [] : [[analyst.name, cap] as const]
  })
  const everyone = policies.everyone.get(dataSet.name)
  const caps = [...holders, ...(everyone === undefined ? [] : [['everyone', everyone] as const])]
  return [
    `${dataSet.name}: the privacy of each ${dataSet.personCalled} (${dataSet.personTable}.${dataSet.personColumn}); a statement spends epsilon ${dataSet.defaults.epsilon} and is answered after ${dataSet.replyAfterMs} ms`,
    ...tables,
    ...caps.map(([name, cap]) => `  ${name}: ${capLine(cap, dataSet)}`),
  ]
}

function privateLine(table: PrivateTable): string {
  const listed = [...table.columns.values()].filter((column) => column.role === 'listed').length
  const proof = table.onePerPerson ? ' (one row each, proved)' : ''
  return `private, ${ownerText(table.owner)}, ${count(table.bounds.groups, 'group')} of ${count(table.bounds.rows, 'row')}${proof}, ${count(listed, 'column')}`
}

function ownerText(owner: Owner): string {
  return owner.kind === 'column'
    ? `owned by ${owner.column}`
    : `owned through ${owner.steps.map((step) => `${step.column} → ${step.table}.${step.referenced}`).join(', ')} → ${owner.person}`
}

function capLine(cap: Cap, dataSet: DataSet): string {
  const amounts = `epsilon ${cap.epsilon}, delta ${cap.delta}, ${cap.renews === 'never' ? 'never renewed' : `renewed each ${cap.renews}`}`
  if (!dataSet.hasUndeclaredKeys) return `${amounts}; every key is declared`
  const { deltaPot } = accountCap(cap, dataSet.hasUndeclaredKeys)
  const each = Fraction.parse(dataSet.defaults.delta)
  if (deltaPot.isZero() || each.isZero()) return `${amounts}; no delta for keys that are not declared`
  return `${amounts}; half of delta buys ${deltaPot.div(each).floor()} key selections at ${dataSet.defaults.delta} each`
}

function count(number: number, noun: string): string {
  return `${number} ${noun}${number === 1 ? '' : 's'}`
}
