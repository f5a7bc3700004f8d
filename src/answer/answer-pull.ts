import { unreachable } from '../base/check.ts'
import { Failure } from '../base/failure.ts'
import { completed, Refusal } from '../base/refusal.ts'
import { accountsOf } from './accounts.ts'
import { explainStatement } from './explain.ts'
import { give } from './give.ts'
import { exampleFor } from '../plan/example.ts'
import type { DataSet } from '../policy/data-set.ts'
import { dataSetFor, dataSetOf, type InForce } from './in-force.ts'
import { noticeOf, outputsOf } from './notice.ts'
import { planText } from './plan-text.ts'
import type { AnswerPull, PullReply, PullRequest } from './ports.ts'
import type { PullParts } from './pull-parts.ts'
import { prepare } from './prepare.ts'
import { priceOf } from './price.ts'
import { readSessionSettings } from './session-settings.ts'
import { sharesOf } from './statement-log.ts'
import { boundsRows, budgetRows, chargesRows, lastAnswerRows } from './views.ts'

type Rows = Extract<PullReply, { kind: 'rows' }>

/** Answers the lobby's hedgerow.* functions. Untrusted text under a session_user that the lobby vouches for. */
export function createAnswerPull(parts: PullParts): AnswerPull {
  return async (request, signal) => {
    try {
      return await dispatch(request, signal, parts)
    } catch (problem) {
      if (signal.aborted) return { kind: 'error', sqlstate: '57014', message: 'canceling statement due to user request', hint: '' }
      return errorReply(problem instanceof Refusal ? withExample(problem, request, parts) : problem, parts)
    }
  }
}

async function dispatch(request: PullRequest, signal: AbortSignal, parts: PullParts): Promise<PullReply> {
  const inForce = parts.inForce()
  const dataSet = dataSetFor(inForce, request.database, request.user)
  switch (request.kind) {
    case 'release':
      return answerBlock(request, signal, inForce, dataSet, parts)
    case 'explain':
      return explainStatement(request, inForce, parts)
    case 'budget':
      return rows(await budgetRows(request, dataSet, inForce.policies, parts.ledger))
    case 'charges':
      return rows(await chargesRows(request, parts.ledger))
    case 'last_answer':
      return rows(lastAnswerRows(parts.lastAnswers.of(request)))
    case 'bounds':
      return rows(boundsRows(dataSet))
    default:
      return unreachable(request.kind)
  }
}

function rows(list: Rows['rows']): Rows {
  return { kind: 'rows', rows: list, notice: '' }
}

async function answerBlock(request: PullRequest, signal: AbortSignal, inForce: InForce, dataSet: DataSet, parts: PullParts): Promise<PullReply> {
  const accounts = accountsOf(inForce.policies, dataSet, request.user)
  const settings = readSessionSettings(request.settings, dataSet)
  const block = await planText(request.text, request, dataSet, settings.limits, parts.parser, parts.describer)
  const prepared = await prepare(block.plan, request.timeZone, parts.lobby)
  if (block.plan.totals.length === 0)
    return rows(
      (prepared.listed ?? []).map((keys) =>
        rowOf(
          block.labels,
          block.plan.columns.map((column) => keys[column.index] ?? null),
        ),
      ),
    )
  const balances = await parts.ledger.balances([accounts.analyst, accounts.everyone])
  const [balance] = balances
  if (balance === undefined) throw new Failure('ledger')
  const price = priceOf(block.plan, prepared.groups, sharesOf(request), settings, accounts.analyst, balance, balances)
  const given = await give(block, prepared, price, accounts, settings, request, parts, signal)
  parts.lastAnswers.add(request, outputsOf(block, price, prepared, settings, given))
  return { kind: 'rows', rows: given.table.rows.map((row) => rowOf(block.labels, row)), notice: noticeOf(block, given, settings, price) }
}

function rowOf(labels: readonly string[], values: readonly (string | null)[]): Readonly<Record<string, string | null>> {
  return Object.fromEntries(labels.map((label, i) => [label, values[i] ?? null]))
}

function withExample(refusal: Refusal, request: PullRequest, parts: PullParts): Refusal {
  const dataSet = dataSetOf(parts.inForce(), request.database)
  return dataSet === null ? refusal : completed(refusal, { example: exampleFor(dataSet, null), person: dataSet.personCalled })
}

/** What the analyst hears of a problem: a refusal in full; the lobby's own complaint about the statement's own values; of anything else a code and a reference. */
function errorReply(problem: unknown, parts: PullParts): PullReply {
  if (problem instanceof Refusal) return { kind: 'error', sqlstate: problem.sqlstate, message: problem.message, hint: problem.hint }
  if (problem instanceof Failure) return failureReply(problem)
  const complaint = lobbyComplaint(problem)
  if (complaint !== null) return complaint
  const failure = new Failure('internal')
  parts.log('error', 'answer.broken', { reference: failure.reference, fault: problem instanceof Error ? problem.message : 'unknown' })
  return failureReply(failure)
}

function failureReply(failure: Failure): PullReply {
  const refusal = new Refusal(failure.code === 'deadline' ? 'release.deadline' : 'release.failed', { reference: failure.reference }, -1)
  return { kind: 'error', sqlstate: refusal.sqlstate, message: refusal.message, hint: refusal.hint }
}

/** An error that PostgreSQL raised in the lobby: it speaks of published data and the statement's own values only. */
function lobbyComplaint(problem: unknown): PullReply | null {
  if (!(problem instanceof Error) || !('code' in problem) || !('severity' in problem) || typeof problem.code !== 'string') return null
  return /^22|^42/.test(problem.code)
    ? { kind: 'error', sqlstate: problem.code, message: problem.message, hint: 'The statement’s own values cause this, whatever the rows are.' }
    : null
}
