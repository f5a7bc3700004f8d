import { Findings } from './complaint.ts'
import type { Outcome, Place } from './complaint.ts'
import { conform } from './conform.ts'
import { compareDecimals, readDecimal } from './decimal.ts'
import type { Decimal } from './decimal.ts'
import { hashOf } from './hash.ts'
import { columnReference, tableKey } from './names.ts'
import { analystsFile, dataSetFile } from './schema.ts'
import type { AnalystsFile, DataSetFile } from './schema.ts'
import { readYaml } from './yaml-text.ts'
import type { Path } from './yaml-text.ts'

/** A policy file that is well formed, with the places of its fields for what the fit finds wrong. */
export interface Draft<T> {
  readonly file: string
  readonly policyHash: string
  readonly content: T
  readonly place: (path: Path) => Place
  readonly keyPlace: (path: Path) => Place
}

export type DraftDataSet = Draft<DataSetFile>
export type DraftAnalysts = Draft<AnalystsFile>

/** Above this the bound on what anyone can learn of a person is close to none. */
const epsilonWorthAWarning: Decimal = { units: 10n, scale: 0 }
/** Common practice keeps delta well below one in the number of persons; no publication sets this very number. */
const deltaWorthAWarning: Decimal = { units: 1n, scale: 4 }

/** Reads a data set's file; `file` is the name that complaints carry. */
export function readDataSetFile(text: string, file: string): Outcome<DraftDataSet> {
  return readDraft(text, file, dataSetFile, (draft, findings) => {
    const { content } = draft
    warnOfAmounts(findings, draft, ['defaults'], content.defaults ?? {})
    const schema = content.schema ?? 'public'
    const seen = new Map<string, string>()
    for (const name of Object.keys(content.tables)) {
      const key = tableKey(name, schema)
      const other = seen.get(key)
      if (other !== undefined) findings.complain(draft.keyPlace(['tables', name]), `tables: ${name} and ${other} are the same table`, 'keep one of the two')
      seen.set(key, name)
    }
  })
}

/** Reads the file of analysts and caps. */
export function readAnalystsFile(text: string, file: string): Outcome<DraftAnalysts> {
  return readDraft(text, file, analystsFile, (draft, findings) => {
    for (const [name, analyst] of Object.entries(draft.content.analysts)) {
      const place = draft.keyPlace(['analysts', name])
      if (analyst.login === undefined || analyst.login === null)
        findings.warn(place, `${name} has no login and cannot connect`, `run: hedgerow password ${name}`)
      const caps = Object.entries(analyst.data ?? {})
      if (caps.length === 0) findings.warn(place, `${name} may use no data set`, `write data: { <dataset>: { epsilon: 4, delta: 1e-6 } } under ${name}`)
      for (const [dataSet, cap] of caps) warnOfAmounts(findings, draft, ['analysts', name, 'data', dataSet], cap)
    }
    for (const [dataSet, cap] of Object.entries(draft.content.everyone)) warnOfAmounts(findings, draft, ['everyone', dataSet], cap)
  })
}

/** Whether a file is the analysts': it has `analysts` or `everyone` at its top. */
export function isAnalystsText(text: string): boolean {
  return /^["']?(analysts|everyone)["']?\s*:/m.test(text) && !/^["']?dataset["']?\s*:/m.test(text)
}

/** The schemas whose relations the fit needs to know of. */
export function schemasOf(draft: DraftDataSet): readonly string[] {
  const schema = draft.content.schema ?? 'public'
  const keys = [...Object.keys(draft.content.tables).map((name) => tableKey(name, schema)), columnReference(draft.content.person.key, schema).table]
  return [...new Set([schema, ...keys.map((key) => key.slice(0, key.indexOf('.')))])]
}

function readDraft<T>(
  text: string,
  file: string,
  schema: Parameters<typeof conform>[1],
  inspect: (draft: Draft<T>, findings: Findings) => void,
): Outcome<Draft<T>> {
  const yaml = readYaml(text, file)
  if (yaml.kind === 'complaints') return yaml
  const content = conform(yaml.value, schema)
  if (content.kind === 'complaints') return content
  const draft: Draft<T> = { file, policyHash: hashOf(text), content: content.value as T, place: yaml.value.place, keyPlace: yaml.value.keyPlace }
  const findings = new Findings()
  inspect(draft, findings)
  return findings.outcome(() => draft)
}

function warnOfAmounts(
  findings: Findings,
  draft: Draft<unknown>,
  path: Path,
  amounts: { readonly epsilon?: string | undefined; readonly delta?: string | undefined },
): void {
  const { epsilon, delta } = amounts
  if (epsilon !== undefined && exceeds(epsilon, epsilonWorthAWarning))
    findings.warn(
      draft.place([...path, 'epsilon']),
      `${path.join('.')}.epsilon: ${epsilon} bounds very little: odds about a person may change by a factor of e^${epsilon}`,
      'choose 10 or less where people must be protected',
    )
  if (delta !== undefined && exceeds(delta, deltaWorthAWarning))
    findings.warn(
      draft.place([...path, 'delta']),
      `${path.join('.')}.delta: ${delta} is large: by common practice delta stays well below one in the number of persons`,
      'choose 1e-6 or less',
    )
}

function exceeds(text: string, ceiling: Decimal): boolean {
  const value = readDecimal(text)
  return value !== null && compareDecimals(value, ceiling) > 0n
}
