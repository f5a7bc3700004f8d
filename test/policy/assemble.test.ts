import { describe, expect, test } from 'vitest'
import { assemble } from '../../src/policy/assemble.ts'
import type { DataSet } from '../../src/policy/data-set.ts'
import { fit } from '../../src/policy/fit.ts'
import { readAnalystsFile, readDataSetFile } from '../../src/policy/read.ts'

const dataSetText =
  'dataset: ferries\nperson: { called: rider, key: riders.rider_id }\ndefaults: { epsilon: 0.5 }\ntables:\n  riders: { person: rider_id, columns: {} }\n'
const integer = { schema: 'pg_catalog', name: 'int4', printed: 'integer', modifier: -1, kind: 'base', labels: [] } as const
const catalog = {
  systemIdentifier: '7',
  serverVersion: 180000,
  tables: [
    {
      schema: 'public',
      name: 'riders',
      kind: 'ordinary',
      columns: [{ name: 'rider_id', type: integer, notNull: true, deterministic: true }],
      primaryKey: ['rider_id'],
      uniqueKeys: [['rider_id']],
      foreignKeys: [],
      readsFrom: [],
    },
  ],
} as const

function assembled(analysts: string) {
  const draft = readDataSetFile(dataSetText, 'ferries.yaml')
  const people = readAnalystsFile(analysts, 'analysts.yaml')
  if (draft.kind !== 'fits' || people.kind !== 'fits') throw new Error('malformed')
  const dataSet = fit(draft.value, catalog)
  if (dataSet.kind !== 'fits') throw new Error('unfit')
  const pair: { draft: typeof draft.value; dataSet: DataSet } = { draft: draft.value, dataSet: dataSet.value }
  return assemble([pair], people.value)
}

const said = (each: { readonly file: string; readonly line: number; readonly column: number; readonly message: string; readonly remedy: string }): string =>
  `${each.file}:${each.line}:${each.column} ${each.message} (${each.remedy})`

describe('data sets and caps together', () => {
  test('a data set that does not exist, and a cap that is missing for everyone, are refused', () => {
    const outcome = assembled(
      'analysts:\n  ana:\n    data:\n      feries: { epsilon: 1, delta: 0 }\n      ferries: { epsilon: 1, delta: 0 }\neveryone: { piers: { epsilon: 1, delta: 0 } }\n',
    )
    expect(outcome.kind === 'complaints' && outcome.complaints.map(said)).toEqual([
      'analysts.yaml:4:7 analysts.ana.data.feries: there is no data set feries (did you mean ferries?)',
      'analysts.yaml:5:7 analysts.ana.data.ferries: everyone has no cap for ferries (write everyone: { ferries: { epsilon: 12, delta: 1e-5 } })',
      'analysts.yaml:6:13 everyone: there is no data set piers (remove the cap, or write the data set; there is ferries)',
    ])
  })

  test("a cap above everyone's, and a default above a cap, are warned of", () => {
    const outcome = assembled(
      'analysts:\n  ana: { login: null, data: { ferries: { epsilon: 0.4, delta: 1.1e-5 } } }\neveryone: { ferries: { epsilon: 0.3999, delta: 1e-5, renews: year } }\n',
    )
    expect([outcome.kind, outcome.warnings.map(said)]).toEqual([
      'fits',
      [
        'analysts.yaml:2:51 analysts.ana.data.ferries.epsilon: 0.4 is above the 0.3999 of everyone, which ends first (lower it, or raise the cap of everyone)',
        'analysts.yaml:2:63 analysts.ana.data.ferries.delta: 1.1e-5 is above the 1e-5 of everyone, which ends first (lower it, or raise the cap of everyone)',
        'ferries.yaml:3:22 defaults.epsilon: 0.5 is more than ana has in all (0.4) (choose a default that leaves room for many statements)',
      ],
    ])
  })

  test('an analyst without login is kept, so that the log-in can be set later', () => {
    const outcome = assembled('analysts: { ana: { data: { ferries: { epsilon: 1, delta: 1e-9 } } } }\neveryone: { ferries: { epsilon: 2, delta: 1e-8 } }\n')
    expect(outcome.kind === 'fits' && outcome.value.analysts.get('ana')).toEqual({
      name: 'ana',
      login: null,
      data: new Map([['ferries', { epsilon: '1', delta: '1e-9', renews: 'never' }]]),
    })
  })
})
