import { Fraction } from '../base/fraction.ts'
import { spentOf, timesLeft } from '../budget/left.ts'
import type { Balance } from '../budget/ledger.ts'
import { statementBudget } from '../budget/statement-budget.ts'
import { pureRho } from '../noise/laplace-law.ts'
import type { DataSet } from '../policy/data-set.ts'

/** How many statements at the data set's default epsilon still fit, under whichever law lasts longer. */
export function defaultStatementsLeft(balance: Balance, dataSet: DataSet): bigint {
  const spent = spentOf(balance)
  const budget = statementBudget(Fraction.parse(dataSet.defaults.epsilon), balance.cap)
  const pure = { epsilon: budget.epsilon, rho: pureRho(budget.epsilon), delta: Fraction.zero }
  const onPure = balance.epsilonSpent === null ? 0n : timesLeft(balance.cap, spent, pure)
  const onRho = budget.rho.isPositive() ? timesLeft(balance.cap, { ...spent, epsilon: null }, { epsilon: null, rho: budget.rho, delta: Fraction.zero }) : 0n
  return onPure > onRho ? onPure : onRho
}
