import { cutStatement } from '../plan/cut.ts'
import { blockText, openText } from '../plan/rewrite.ts'
import { refuse } from '../base/refusal.ts'
import { BoundedQuery } from '../bound/bounded-query.ts'
import { groupsToKeep, reachOf } from '../bound/reach.ts'
import { spentOf, timesLeft } from '../budget/left.ts'
import { printExpr } from '../sql/print.ts'
import type { Statement } from '../sql/tree.ts'
import { accountsOf } from './accounts.ts'
import type { PullParts } from './pull-parts.ts'
import { expectedMargin, figure, rowsOf, scaleText, tablesOf } from './describe-release.ts'
import { leftText } from './give.ts'
import { dataSetFor, type InForce } from './in-force.ts'
import { chargeText, percent } from './notice.ts'
import { planText } from './plan-text.ts'
import type { PullReply, PullRequest } from './ports.ts'
import { type Prepared, prepare } from './prepare.ts'
import { type Price, priceOf } from './price.ts'
import { readSessionSettings, type SessionSettings } from './session-settings.ts'
import type { PlannedBlock } from './plan-text.ts'
import type { Balance } from '../budget/ledger.ts'

interface Explained {
  readonly block: PlannedBlock
  readonly prepared: Prepared
  readonly price: Price
  readonly sql: string
}

/** EXPLAIN of a private statement: what each of its releases would be and cost. Nothing is run or debited, and the vault is not asked. */
export async function explainStatement(request: PullRequest, inForce: InForce, parts: PullParts): Promise<PullReply> {
  const dataSet = dataSetFor(inForce, request.database, request.user)
  const accounts = accountsOf(inForce.policies, dataSet, request.user)
  const settings = readSessionSettings(request.settings, dataSet)
  const outcome = await parts.parser.readText(request.text)
  const placed = outcome.kind === 'read' ? outcome.statements[0] : undefined
  if (placed === undefined || placed.refusal !== null || placed.statement.kind !== 'explain')
    return refuse('block.shape', { what: 'EXPLAIN of anything but one statement that can be read' })
  const cut = cutStatement(placed.statement.statement, dataSet)
  const balances = await parts.ledger.balances([accounts.analyst, accounts.everyone])
  const [balance] = balances
  const explained: Explained[] = []
  for (const each of cut.blocks) {
    const description = await parts.describer.block(dataSet, openText(each), [])
    if (description.kind === 'complaint') return { kind: 'error', sqlstate: description.sqlstate, message: description.message, hint: '' }
    const text = blockText(each, description.types)
    const block = await planText(
      text,
      { args: each.parameters.map((number) => request.args[number - 1] ?? null), now: request.now, timeZone: request.timeZone },
      dataSet,
      settings.limits,
      parts.parser,
      parts.describer,
    )
    const prepared = await prepare(block.plan, request.timeZone, parts.lobby)
    const price =
      balance === undefined
        ? refuse('account.closed', { user: request.user, dataset: dataSet.name })
        : priceOf(block.plan, prepared.groups, cut.blocks.length, settings, accounts.analyst, balance, balances)
    explained.push({
      block,
      prepared,
      price,
      sql: BoundedQuery.of(block.plan, prepared.fixed, {
        keep: groupsToKeep(block.plan, prepared.listed?.length ?? null),
        salts: Array.from({ length: block.plan.keys.length + 1 }, () => 0n),
      }).text,
    })
  }
  const verbose = wants(placed.statement, 'verbose')
  const lines = explained.flatMap((each, i) => linesOf(each, i, explained.length, settings, balance, verbose))
  const all = lines.length === 0 ? ['Nothing private is asked: the statement is free'] : lines
  return { kind: 'rows', rows: jsonOrText(placed.statement, all), notice: '' }
}

function wants(statement: Extract<Statement, { kind: 'explain' }>, name: string): boolean {
  const option = statement.options.find((each) => each.name === name)
  if (option === undefined) return false
  const value = option.value
  return (
    value === null ||
    (value.kind === 'boolean' && value.value) ||
    (value.kind === 'string' && ['true', 'on'].includes(value.value)) ||
    (value.kind === 'integer' && value.value === '1')
  )
}

function jsonOrText(statement: Extract<Statement, { kind: 'explain' }>, lines: readonly string[]): readonly Readonly<Record<string, string>>[] {
  const format = statement.options.find((each) => each.name === 'format')?.value
  if (format?.kind === 'string' && format.value === 'json') return [{ c1: JSON.stringify([{ Plan: { 'Node Type': 'Release', Lines: lines } }], null, 2) }]
  return lines.map((c1) => ({ c1 }))
}

function linesOf(each: Explained, i: number, count: number, settings: SessionSettings, balance: Balance | undefined, verbose: boolean): readonly string[] {
  const { plan } = each.block
  const { price } = each
  const head = `Release${count > 1 ? ` ${(i + 1).toString()} of ${count.toString()}` : ''} from ${tablesOf(plan).join(', ')}`
  const outputs = plan.columns.flatMap((column, place) => {
    const output = column.kind === 'output' ? plan.outputs[column.index] : undefined
    const total = output === undefined ? undefined : plan.totals[output.total]
    const mechanism = output === undefined ? undefined : price.mechanisms[output.total]
    if (output === undefined || total === undefined || mechanism === undefined) return []
    const call = each.block.calls[place]
    const margin = expectedMargin(output, plan, price, settings.confidence)
    const rows = rowsOf(total)
    return [
      `  Output: ${call === undefined ? '' : printExpr(call)}`,
      `    Bound: ${rows === null ? 'each person counts once in a group' : `${rows} rows of a person in a group`}; sensitivity ${reachOf(total).toString()} in each of ${each.prepared.groups.toString()} groups`,
      `    Noise: ${mechanism.kind}, ${mechanism.kind === 'laplace' ? 'scale' : 'variance'} ${figure(mechanism.kind === 'laplace' ? mechanism.scale : mechanism.variance)} (${scaleText(mechanism).length < 40 ? scaleText(mechanism) : 'exact in hedgerow.last_answer'})`,
      `    Margin (${percent(settings.confidence)}): ${margin === null ? 'depends on the number of rows; hedgerow.last_answer has it afterwards' : `± ${margin}`}`,
    ]
  })
  const why = `  Noise law: ${price.kind}, ${price.reason}${price.runnerUp === null ? '' : `; ${price.runnerUp.kind} would have ${ratio(price)} times its relative variance`}`
  const left =
    balance === undefined
      ? []
      : [
          `  Left before it: ${leftText(balance)}`,
          `  Like it, in all: ${!price.charge.rho.isPositive() ? 'without end' : timesLeft(balance.cap, spentOf(balance), price.charge).toString()}`,
        ]
  const charged = price.mechanisms.length === 0 ? ['  Charge: none'] : [why, `  Charge: ${chargeText(price.charge)}`, ...left]
  return [head, `  Groups: ${groupsText(each)}`, ...capsText(each), ...outputs, ...charged, ...(verbose ? [`  Vault: ${each.sql}`] : [])]
}

function ratio(price: Price): string {
  if (price.runnerUp === null) return '1'
  const own = price.taken.relativeVariance
  return own.isPositive() ? figure(price.runnerUp.relativeVariance.div(own)) : 'many'
}

function groupsText(each: Explained): string {
  const { plan } = each.block
  const most = `a person counts in at most ${each.prepared.groups.toString()}`
  switch (plan.groups.kind) {
    case 'one':
      return 'one'
    case 'listed':
      return `${(each.prepared.listed?.length ?? 0).toString()}, listed by the policy or the statement, empty ones included; ${most}`
    case 'selected':
      return `those whose noisy number of persons reaches ${each.price.threshold?.toString() ?? '?'}; ${most}`
  }
}

function capsText(each: Explained): readonly string[] {
  const caps = [...each.block.plan.fanOut.capped.values()]
  return caps.length === 0 ? [] : [`  Joins: at most ${caps.map((cap) => cap.toString()).join(' and ')} rows of a person from each joined table`]
}
