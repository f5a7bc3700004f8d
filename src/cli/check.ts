import { errorCode } from '../files/policy-texts.ts'
import { loadPolicies } from '../files/load-policies.ts'
import type { CatalogOf } from '../files/load-policies.ts'
import { printComplaint } from '../policy/complaint.ts'
import { summary } from './summary.ts'

/** `hedgerow check`: the verdict on a directory of policies, held against the vault. Returns the exit code: 1 where anything is complained of; warnings alone are 0. */
export async function check(directory: string, catalogOf: CatalogOf, say: (line: string) => void): Promise<0 | 1> {
  let outcome
  try {
    outcome = await loadPolicies(directory, catalogOf)
  } catch (error) {
    say(`the files are well formed, but the vault's catalogue cannot be read (${reason(error)}): check HEDGEROW_VAULT_URL`)
    return 1
  }
  for (const warning of outcome.warnings) say(`warning: ${printComplaint(warning)}`)
  if (outcome.kind === 'complaints') {
    for (const complaint of outcome.complaints) say(printComplaint(complaint))
    say(`${outcome.complaints.length === 1 ? '1 complaint' : `${outcome.complaints.length} complaints`}: these policies will not be loaded`)
    return 1
  }
  for (const line of summary(outcome.value)) say(line)
  say('the policies fit the vault')
  return 0
}

/** The catalogue's errors are about servers and roles, never about rows: their text may be shown to whoever runs the proxy. */
function reason(error: unknown): string {
  if (error instanceof Error && error.message !== '') return error.message
  return errorCode(error)
}
