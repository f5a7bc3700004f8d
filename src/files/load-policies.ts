import type { Catalog } from '../catalog/catalog.ts'
import { assemble, complainOfCaps, complainOfTwins } from '../policy/assemble.ts'
import { Findings } from '../policy/complaint.ts'
import type { Outcome } from '../policy/complaint.ts'
import type { DataSet, Policies } from '../policy/data-set.ts'
import { fit } from '../policy/fit.ts'
import { isAnalystsText, readAnalystsFile, readDataSetFile, schemasOf } from '../policy/read.ts'
import type { DraftAnalysts, DraftDataSet } from '../policy/read.ts'
import { policyTexts } from './policy-texts.ts'

/** Reads the vault's catalogue for some schemas. */
export interface CatalogOf {
  (schemas: readonly string[]): Promise<Catalog>
}

/**
 * All policies of a directory: analysts.yaml is the file with `analysts` at its top, every other *.yaml a data set. All or nothing: one complaint, and nothing is
 * loaded. The catalogue is asked for once, and only when the files themselves are in order. Throws what `catalogOf` throws.
 */
export async function loadPolicies(directory: string, catalogOf: CatalogOf): Promise<Outcome<Policies>> {
  const findings = new Findings()
  const dataSets: DraftDataSet[] = []
  const analysts: DraftAnalysts[] = []
  for (const { file, text } of await policyTexts(directory, findings)) {
    const outcome = isAnalystsText(text) ? readAnalystsFile(text, file) : readDataSetFile(text, file)
    findings.take(outcome)
    if (outcome.kind === 'complaints') continue
    if ('analysts' in outcome.value.content) analysts.push(outcome.value as DraftAnalysts)
    else dataSets.push(outcome.value as DraftDataSet)
  }
  const whole = { file: directory, line: 1, column: 1 }
  const readable = findings.clean
  if (readable && dataSets.length === 0)
    findings.complain(whole, 'there is no data set here', 'write a policy such as ferries.yaml, with dataset, person and tables')
  if (readable && analysts.length === 0) findings.complain(whole, 'there is no file of analysts here', 'write analysts.yaml, with analysts and everyone')
  for (const extra of analysts.slice(1))
    findings.complain(extra.keyPlace(['analysts']), `analysts are listed in ${analysts[0]?.file ?? ''} as well`, 'keep all analysts in one file')
  complainOfTwins(dataSets, findings)
  if (!findings.clean) return findings.outcome(nothing)
  const catalog = await catalogOf([...new Set(dataSets.flatMap(schemasOf))].toSorted())
  const fitted: { draft: DraftDataSet; dataSet: DataSet }[] = []
  for (const draft of dataSets) {
    const outcome = fit(draft, catalog)
    findings.take(outcome)
    if (outcome.kind === 'fits') fitted.push({ draft, dataSet: outcome.value })
  }
  const [draftAnalysts] = analysts
  if (draftAnalysts === undefined) return findings.outcome(nothing)
  if (fitted.length < dataSets.length) {
    complainOfCaps(
      draftAnalysts,
      dataSets.map((draft) => draft.content.dataset),
      findings,
    )
    return findings.outcome(nothing)
  }
  const policies = assemble(fitted, draftAnalysts)
  findings.take(policies)
  return findings.outcome(() => (policies.kind === 'fits' ? policies.value : nothing()))
}

function nothing(): never {
  throw new Error('complaints are left, so there is nothing to load')
}
