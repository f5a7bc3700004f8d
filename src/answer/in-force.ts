import { refuse } from '../base/refusal.ts'
import type { DataSet, Policies } from '../policy/data-set.ts'

/** The policies in force; a load replaces them whole. */
export interface InForce {
  readonly policies: Policies
}

/** The data set of a lobby database, or null where the database is none. */
export function dataSetOf(inForce: InForce, database: string): DataSet | null {
  return inForce.policies.dataSets.get(database) ?? null
}

/** The data set a pull speaks of; the lobby's databases are the data sets, so a missing one was just taken out of the policies. */
export function dataSetFor(inForce: InForce, database: string, user: string): DataSet {
  return dataSetOf(inForce, database) ?? refuse('account.closed', { user, dataset: database })
}
