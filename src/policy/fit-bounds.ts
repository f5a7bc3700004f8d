import type { Findings } from './complaint.ts'
import type { Owner, PrivateTable } from './data-set.ts'
import type { Schemed } from './fit-tables.ts'
import type { DraftDataSet } from './read.ts'

type Bounds = PrivateTable['bounds']

/** Rows of a person over all groups; a greater product bounds nothing and only costs accuracy. */
export const productCeiling = 1_000_000_000

/**
 * A private table's bounds as declared. Where a row is proved to be the person's only one, both are 1 whatever is declared. A table owned through
 * another takes that table's bounds where it declares none: bounds are enforced on every answer, so any number is sound. A way to the person that could not be made out is complained of elsewhere.
 */
export function fitBounds(
  draft: DraftDataSet,
  tables: Schemed,
  owners: ReadonlyMap<string, Owner>,
  key: string,
  onePerPerson: boolean,
  findings: Findings,
): Bounds {
  const listed = tables.owned.get(key)
  if (listed === undefined) return { groups: 1, rows: 1 }
  const declared = listed.declared.bounds
  const path = ['tables', listed.listedAs]
  if (onePerPerson) {
    if ((declared?.rows ?? '1') !== '1' || (declared?.groups ?? '1') !== '1')
      findings.warn(
        draft.place([...path, 'bounds']),
        `${key} has one row for each person: its bounds are taken as 1 group and 1 row`,
        'write bounds: { groups: 1, rows: 1 }',
      )
    return { groups: 1, rows: 1 }
  }
  if (declared === undefined) {
    const owner = owners.get(key)
    const next = owner?.kind === 'through' ? owner.steps[0]?.table : undefined
    if (next !== undefined) return inherited(draft, tables, owners, next)
    if (typeof listed.declared.person !== 'string') return { groups: 1, rows: 1 }
    findings.complain(
      draft.keyPlace(path),
      `tables.${listed.listedAs}: bounds is missing`,
      'write bounds: { groups: 12, rows: 20 }: the groups a person may touch, and the rows in each',
    )
    return { groups: 1, rows: 1 }
  }
  for (const part of ['groups', 'rows'] as const) {
    if (declared[part] === undefined)
      findings.complain(draft.place([...path, 'bounds']), `tables.${listed.listedAs}.bounds.${part} is missing`, 'write bounds: { groups: 12, rows: 20 }')
  }
  const bounds = { groups: Number(declared.groups ?? 1), rows: Number(declared.rows ?? 1) }
  if (bounds.groups * bounds.rows > productCeiling)
    findings.complain(
      draft.place([...path, 'bounds']),
      `tables.${listed.listedAs}.bounds: ${bounds.groups} groups of ${bounds.rows} rows are more than ${productCeiling} rows for one person`,
      'choose numbers that most persons stay below; the fewer, the less noise',
    )
  return bounds
}

/** The bounds of the table that owns; what is wrong with them is complained of there. */
function inherited(draft: DraftDataSet, tables: Schemed, owners: ReadonlyMap<string, Owner>, key: string): Bounds {
  const declared = tables.owned.get(key)?.declared.bounds
  if (declared !== undefined) return { groups: Number(declared.groups ?? 1), rows: Number(declared.rows ?? 1) }
  const owner = owners.get(key)
  const next = owner?.kind === 'through' ? owner.steps[0]?.table : undefined
  return next === undefined ? { groups: 1, rows: 1 } : inherited(draft, tables, owners, next)
}
