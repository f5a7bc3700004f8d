import { Findings } from './complaint.ts'
import type { Outcome } from './complaint.ts'
import type { Analyst, Cap, DataSet, Policies } from './data-set.ts'
import { compareDecimals, readDecimal } from './decimal.ts'
import { didYouMean } from './near.ts'
import type { DraftAnalysts, DraftDataSet } from './read.ts'
import type { CapFile } from './schema.ts'

/** Joins fitted data sets and the analysts' file: every data set an analyst may use exists and has a cap over everyone. */
export function assemble(fitted: readonly { readonly draft: DraftDataSet; readonly dataSet: DataSet }[], analysts: DraftAnalysts): Outcome<Policies> {
  const findings = new Findings()
  const dataSets = new Map(fitted.map(({ dataSet }) => [dataSet.name, dataSet]))
  complainOfCaps(analysts, [...dataSets.keys()], findings)
  for (const { draft, dataSet } of fitted) warnOfDefaults(draft, dataSet, analysts, findings)
  return findings.outcome(() => ({
    dataSets,
    analysts: new Map(
      Object.entries(analysts.content.analysts).map(([name, analyst]) => [
        name,
        { name, login: analyst.login ?? null, data: caps(analyst.data ?? {}) } satisfies Analyst,
      ]),
    ),
    everyone: caps(analysts.content.everyone),
  }))
}

/** One data set may be declared in one file only. */
export function complainOfTwins(drafts: readonly DraftDataSet[], findings: Findings): void {
  const files = new Map<string, string>()
  for (const draft of drafts) {
    const name = draft.content.dataset
    const other = files.get(name)
    if (other !== undefined)
      findings.complain(draft.place(['dataset']), `dataset: ${name} is declared in ${other} as well`, 'rename one of the two, or remove the file')
    else files.set(name, draft.file)
  }
}

/** Checks what the caps say of one another; `dataSets` are the names that exist. */
export function complainOfCaps(analysts: DraftAnalysts, dataSets: readonly string[], findings: Findings): void {
  const { content } = analysts
  for (const name of Object.keys(content.everyone)) {
    if (!dataSets.includes(name))
      findings.complain(
        analysts.keyPlace(['everyone', name]),
        `everyone: there is no data set ${name}`,
        didYouMean(name, dataSets, 'remove the cap, or write the data set'),
      )
  }
  for (const [name, analyst] of Object.entries(content.analysts)) {
    for (const [dataSet, cap] of Object.entries(analyst.data ?? {})) {
      const path = ['analysts', name, 'data', dataSet]
      const everyone = content.everyone[dataSet]
      if (!dataSets.includes(dataSet))
        findings.complain(
          analysts.keyPlace(path),
          `${path.join('.')}: there is no data set ${dataSet}`,
          didYouMean(dataSet, dataSets, 'remove it, or write the data set'),
        )
      else if (everyone === undefined)
        findings.complain(
          analysts.keyPlace(path),
          `${path.join('.')}: everyone has no cap for ${dataSet}`,
          `write everyone: { ${dataSet}: { epsilon: 12, delta: 1e-5 } }`,
        )
      else {
        for (const amount of ['epsilon', 'delta'] as const) {
          if (exceeds(cap[amount], everyone[amount]))
            findings.warn(
              analysts.place([...path, amount]),
              `${[...path, amount].join('.')}: ${cap[amount]} is above the ${everyone[amount]} of everyone, which ends first`,
              'lower it, or raise the cap of everyone',
            )
        }
      }
    }
  }
}

function warnOfDefaults(draft: DraftDataSet, dataSet: DataSet, analysts: DraftAnalysts, findings: Findings): void {
  for (const [name, analyst] of Object.entries(analysts.content.analysts)) {
    const cap = analyst.data?.[dataSet.name]
    if (cap !== undefined && exceeds(dataSet.defaults.epsilon, cap.epsilon))
      findings.warn(
        draft.place(['defaults', 'epsilon']),
        `defaults.epsilon: ${dataSet.defaults.epsilon} is more than ${name} has in all (${cap.epsilon})`,
        'choose a default that leaves room for many statements',
      )
  }
}

function exceeds(a: string, b: string): boolean {
  const [left, right] = [readDecimal(a), readDecimal(b)]
  return left !== null && right !== null && compareDecimals(left, right) > 0n
}

function caps(written: Readonly<Record<string, CapFile>>): ReadonlyMap<string, Cap> {
  return new Map(Object.entries(written).map(([name, cap]) => [name, { epsilon: cap.epsilon, delta: cap.delta, renews: cap.renews ?? 'never' }]))
}
