import { BrokenCheck } from '../base/check.ts'
import type { Cap } from '../policy/data-set.ts'
import type { AccountCap } from './ledger.ts'

/** Makes a policy's cap ready for the rule; a RangeError where a text is no number or out of range (epsilon > 0, 0 <= delta < 1). */
export function accountCap(_cap: Cap, _hasUndeclaredKeys: boolean): AccountCap {
  throw new BrokenCheck('accountCap')
}
