import { createHash } from 'node:crypto'
import { BrokenCheck, check } from '../base/check.ts'
import { Failure } from '../base/failure.ts'
import { Fraction } from '../base/fraction.ts'
import type { Clock, Log, RandomBytes } from '../base/ports.ts'
import { refuse } from '../base/refusal.ts'
import { BoundedQuery } from '../bound/bounded-query.ts'
import { groupsToKeep } from '../bound/reach.ts'
import { addCharge } from '../budget/accept.ts'
import { debitFrom } from '../budget/debit.ts'
import type { Balance, Charge, Ledger } from '../budget/ledger.ts'
import { BitSource } from '../noise/bits.ts'
import { sameTree } from '../sql/equal.ts'
import type { Parser } from '../sql/parser.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import { type ExactTable, release, type ReleasedTable } from '../release/release.ts'
import { accountCalled, type Accounts } from './accounts.ts'
import { figure, ledgerNote } from './describe-release.ts'
import type { Overruns } from './overruns.ts'
import type { PlannedBlock } from './plan-text.ts'
import type { PullRequest } from './ports.ts'
import type { Prepared } from './prepare.ts'
import type { Price } from './price.ts'
import { sharesOf, type StatementLog } from './statement-log.ts'
import { timeClasses } from './time-class.ts'
import type { SessionSettings } from './session-settings.ts'

/** The vault as the pipeline meets it. */
export interface AskVault {
  ask(query: BoundedQuery, options: { readonly timeZone: string; readonly deadlineMs: number; readonly signal: AbortSignal }): Promise<ExactTable>
}

/** Places for statements in the vault; one is held until its reply leaves, so that not even waiting for one tells how long another took. */
export interface Slots {
  take(owner: string, signal: AbortSignal): Promise<() => void>
}

export interface GiveParts {
  readonly ledger: Ledger
  readonly vault: AskVault
  readonly slots: Slots
  readonly parser: Parser
  readonly clock: Clock
  readonly random: RandomBytes
  readonly log: Log
  readonly statements: StatementLog
  readonly overruns: Overruns
  readonly deadlineMs: number
}

export interface Given {
  readonly table: ReleasedTable
  readonly charge: Charge
  readonly balances: readonly Balance[]
  /** The instant of the debit, milliseconds since the epoch. */
  readonly at: number
}

/** Debits, asks the vault, releases, stores, and waits for the reply's instant. In that order and no other. */
export async function give(
  block: PlannedBlock,
  prepared: Prepared,
  price: Price,
  accounts: Accounts,
  settings: SessionSettings,
  request: PullRequest,
  parts: GiveParts,
  signal: AbortSignal,
): Promise<Given> {
  const { plan } = block
  const query = await boundedQuery(plan, prepared, parts)
  const giveBack = await parts.slots.take(accounts.analyst.id, signal)
  let leave = (now: number): number => now
  try {
    if (parts.overruns.isPaused(accounts.analyst.id, parts.clock.now())) refuse('account.overruns')
    const outcome = await debit(plan, prepared, price, accounts, request, parts)
    const start = parts.clock.now()
    const classes = timeClasses(plan, parts.deadlineMs)
    const work = (async (): Promise<ReleasedTable> => {
      const exact = await parts.vault.ask(query, { timeZone: request.timeZone, deadlineMs: parts.deadlineMs, signal })
      const order = {
        plan,
        mechanisms: price.mechanisms,
        listed: prepared.listed,
        threshold: price.threshold,
        show: { confidence: settings.confidence, nonnegative: settings.nonnegative },
      }
      const table = release(exact, debitFrom(outcome), order, new BitSource(parts.random))
      await parts.ledger.store(table.id, JSON.stringify({ columns: block.labels, rows: table.rows }))
      return table
    })()
    leave = nextInstant(start, classes)
    const table = await atItsInstant(work, start, classes, accounts.analyst.id, parts, signal)
    return { table, charge: price.charge, balances: outcome.balances, at: start }
  } finally {
    // by INVARIANT QUIET: a place that a cancel frees at once would tell how long the others wait for it
    if (signal.aborted) void parts.clock.until(leave(parts.clock.now())).then(giveBack, giveBack)
    else giveBack()
  }
}

/** The first instant of a release's classes that is not before `now`. */
function nextInstant(start: number, classes: readonly number[]): (now: number) => number {
  return (now) => classes.map((each) => start + each).find((instant) => instant >= now) ?? now
}

/** Our own SQL is several times as long as what was asked. */
const vaultTextBytes = 1_048_576

/** The bounded SQL, held against the tree it was printed from before anything is debited: parsed and read again, it is that tree. */
async function boundedQuery(plan: ReleasePlan, prepared: Prepared, parts: GiveParts): Promise<BoundedQuery> {
  const query = BoundedQuery.of(plan, prepared.fixed, {
    keep: groupsToKeep(plan, prepared.listed?.length ?? null),
    salts: freshSalts(plan.keys.length + 1, parts.random),
  })
  const outcome = await parts.parser.readText(query.text, vaultTextBytes)
  const read = outcome.kind === 'read' && outcome.statements.length === 1 ? outcome.statements[0] : undefined
  check(
    read !== undefined && read.refusal === null && read.statement.kind === 'query' && sameTree(read.statement.query, query.tree),
    "the vault's SQL reads as the tree it was printed from",
  )
  return query
}

/** Fresh and secret: 64 bits for the person and for each key. */
export function freshSalts(count: number, random: RandomBytes): readonly bigint[] {
  return Array.from({ length: count }, () => random(8).reduce((salt, byte) => (salt << 8n) | BigInt(byte), 0n)).map((salt) => BigInt.asIntN(64, salt))
}

async function debit(
  plan: ReleasePlan,
  prepared: Prepared,
  price: Price,
  accounts: Accounts,
  request: PullRequest,
  parts: GiveParts,
): ReturnType<typeof debited> {
  const remaining = sharesOf(request) > 1 ? parts.statements.remaining(request) : 0
  const reserve = remaining === 0 ? null : times(price.charge, remaining)
  const note = {
    analyst: request.user,
    dataSet: plan.dataSet.name,
    policyHash: plan.dataSet.policyHash,
    application: request.application.slice(0, 64),
    fingerprint: fingerprintOf(request, plan),
    release: ledgerNote(plan, price, prepared.groups),
  }
  const outcome = await debited(accounts, price.charge, reserve, note, parts)
  parts.statements.paid(request)
  return outcome
}

async function debited(accounts: Accounts, charge: Charge, reserve: Charge | null, note: Parameters<Ledger['debit']>[3], parts: GiveParts) {
  const outcome = await parts.ledger.debit([accounts.analyst, accounts.everyone], charge, reserve, note)
  if (outcome.kind === 'debited') return outcome
  const balance = outcome.balances.find((each) => each.account === outcome.account)
  const asked = reserve === null ? charge : addCharge(charge, reserve)
  return refuse('budget.spent', {
    account: accountCalled(outcome.account),
    asked: asked.epsilon === null ? `rho ${figure(asked.rho)}` : `epsilon ${figure(asked.epsilon)}`,
    left: balance === undefined ? 'nothing is left' : leftText(balance),
  })
}

/** What is left on both tracks, for people. */
export function leftText(balance: Balance): string {
  const rho = balance.cap.rhoCap.sub(balance.rhoSpent).max(Fraction.zero)
  const delta = balance.cap.deltaPot.sub(balance.deltaSpent).max(Fraction.zero)
  const epsilon = balance.epsilonSpent === null ? null : balance.cap.epsilon.sub(balance.epsilonSpent).max(Fraction.zero)
  const tracks = epsilon === null ? `rho ${down(rho)}` : `epsilon ${down(epsilon)} or rho ${down(rho)}`
  return balance.cap.deltaPot.isPositive() ? `${tracks}, and delta ${down(delta)} for choosing keys, are left` : `${tracks} is left`
}

function down(value: Fraction): string {
  return value.isZero() ? '0' : figure(value)
}

function times(charge: Charge, count: number): Charge {
  const by = Fraction.make(BigInt(count))
  return { epsilon: charge.epsilon === null ? null : charge.epsilon.mul(by), rho: charge.rho.mul(by), delta: charge.delta.mul(by) }
}

/** The plan's own print, without the salts' values or the statement's: it says whether two releases asked the same thing. */
function fingerprintOf(request: PullRequest, plan: ReleasePlan): string {
  return createHash('sha256')
    .update(JSON.stringify([plan.dataSet.policyHash, request.text.replace(/'(?:[^']|'')*'|\b\d+(\.\d+)?\b/g, '?')]))
    .digest('hex')
}

/**
 * INVARIANT QUIET: the outcome, answer or failure, is handed on at the first instant of the plan's classes at which it is ready; a later one than the first is counted.
 * An abort ends the wait at once.
 */
async function atItsInstant(
  work: Promise<ReleasedTable>,
  start: number,
  classes: readonly number[],
  account: string,
  parts: GiveParts,
  signal: AbortSignal,
): Promise<ReleasedTable> {
  let settled: { readonly table: ReleasedTable } | { readonly failure: Failure } | null = null
  const done = work.then(
    (table) => (settled = { table }),
    (problem: unknown) => (settled = { failure: problem instanceof Failure ? problem : signal.aborted ? new Failure('internal') : broken(problem, parts.log) }),
  )
  for (const [i, classMs] of classes.entries()) {
    await parts.clock.until(start + classMs, signal)
    const outcome = settled as { readonly table: ReleasedTable } | { readonly failure: Failure } | null
    if (outcome === null) {
      if (i === 0) parts.overruns.count(account, parts.clock.now())
      continue
    }
    if ('table' in outcome) return outcome.table
    // that it failed may be the rows' doing, as is a reply that comes late
    if (i === 0) parts.overruns.count(account, parts.clock.now())
    throw outcome.failure
  }
  void done
  throw new Failure('deadline')
}

/** A fault of our own after rows may have been read: its kind is logged, never a text that could quote them. */
function broken(problem: unknown, log: Log): Failure {
  const failure = new Failure('internal')
  log('error', 'answer.broken', { reference: failure.reference, check: problem instanceof BrokenCheck ? problem.message : 'unexpected' })
  return failure
}
