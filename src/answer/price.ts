import { check } from '../base/check.ts'
import { Fraction } from '../base/fraction.ts'
import { refuse } from '../base/refusal.ts'
import { reachesOf } from '../bound/reach.ts'
import type { Account, Balance, Charge } from '../budget/ledger.ts'
import { statementBudget } from '../budget/statement-budget.ts'
import { type Candidate, choose, type NoiseCharge } from '../noise/choose.ts'
import type { Mechanism } from '../noise/make-mechanism.ts'
import { keyThreshold } from '../noise/threshold.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import type { SessionSettings } from './session-settings.ts'
import { defaultStatementsLeft } from './default-statements.ts'

/** What a release costs and which noise it gets, fixed before anything is debited. */
export interface Price {
  readonly charge: Charge
  /** One for each total. */
  readonly mechanisms: readonly Mechanism[]
  readonly kind: Mechanism['kind']
  readonly taken: Candidate
  readonly runnerUp: Candidate | null
  /** Why the law was taken, in one line. */
  readonly reason: string
  readonly threshold: bigint | null
}

/**
 * The price of one of `blocks` equal shares of a statement's epsilon. A function of plan, settings and account alone. INVARIANT STATIC; INVARIANT CALIBRATED:
 * the sensitivities are the plan's own.
 */
export function priceOf(
  plan: ReleasePlan,
  groups: bigint,
  blocks: number,
  settings: SessionSettings,
  account: Account,
  balance: Balance,
  balances: readonly Balance[],
): Price {
  const selects = plan.groups.kind === 'selected'
  const shares = Fraction.make(BigInt(blocks))
  const delta = selects ? settings.delta.div(shares) : Fraction.zero
  if (selects && (!account.cap.deltaPot.isPositive() || !delta.isPositive())) refuse('keys.no-delta')
  const budget = statementBudget(settings.epsilon.div(shares), account.cap, delta)
  const reaches = reachesOf(plan, groups)
  if (reaches.length === 0)
    return {
      charge: { epsilon: Fraction.zero, rho: Fraction.zero, delta: Fraction.zero },
      mechanisms: [],
      kind: 'laplace',
      taken: nothingTaken,
      runnerUp: null,
      reason: 'every group is declared, so nothing is asked of the vault',
      threshold: null,
    }
  const open = balance.epsilonSpent !== null
  const choice = choose(reaches, { epsilon: open ? budget.epsilon : null, rho: budget.rho }, settings.noise)
  if (choice === null) {
    if (settings.noise === 'gaussian')
      return refuse('setting.bad', { name: 'noise', value: 'gaussian', expected: 'laplace or auto: this account has no delta', sample: 'auto' })
    return refuse('budget.spent', { account: 'your', asked: `epsilon ${settings.epsilon.toDecimal(6, 'up')}`, left: 'no track of this account can bear it' })
  }
  const taken = keepsPureTrack(plan, choice, settings, balances)
  const made = taken.candidate
  const persons = plan.groups.kind === 'selected' ? made.mechanisms[plan.groups.persons] : undefined
  check(!selects || persons !== undefined, 'selected groups have a mechanism for their person count')
  return {
    charge: { ...made.charge, delta },
    mechanisms: made.mechanisms,
    kind: made.kind,
    taken: made,
    runnerUp: taken.runnerUp,
    reason: taken.reason,
    threshold: persons === undefined ? null : keyThreshold(persons, groups, delta),
  }
}

const nothingTaken: Candidate = { kind: 'laplace', mechanisms: [], charge: { epsilon: Fraction.zero, rho: Fraction.zero }, relativeVariance: Fraction.zero }

interface Taken {
  readonly candidate: Candidate
  readonly runnerUp: Candidate | null
  readonly reason: string
}

/** 'auto' never makes an account's (the analyst's or everyone's) first Gaussian release where that lowers the number of default statements left: one Gaussian release closes the pure track. */
function keepsPureTrack(
  plan: ReleasePlan,
  choice: Candidate & { readonly runnerUp: Candidate | null },
  settings: SessionSettings,
  balances: readonly Balance[],
): Taken {
  const { runnerUp } = choice
  if (settings.noise !== 'auto') return { candidate: choice, runnerUp, reason: `as set by hedgerow.noise` }
  if (choice.kind === 'gaussian' && runnerUp !== null) {
    const loses = balances.some((balance) => {
      const left = (noise: NoiseCharge): bigint => defaultStatementsLeft(after(balance, noise), plan.dataSet)
      return balance.epsilonSpent !== null && left(choice.charge) + 1n < left(runnerUp.charge)
    })
    if (loses) return { candidate: runnerUp, runnerUp: choice, reason: 'a first Gaussian release would leave fewer default statements' }
  }
  return { candidate: choice, runnerUp, reason: runnerUp === null ? 'the only law this account can pay for' : 'the lesser variance at the same charge' }
}

function after(balance: Balance, noise: NoiseCharge): Balance {
  const epsilonSpent = balance.epsilonSpent === null || noise.epsilon === null ? null : balance.epsilonSpent.add(noise.epsilon)
  return { ...balance, epsilonSpent, rhoSpent: balance.rhoSpent.add(noise.rho) }
}
