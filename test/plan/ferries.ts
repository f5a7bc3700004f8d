import type { CatalogType } from '../../src/catalog/catalog.ts'
import { printedType, scalarType, type ScalarType } from '../../src/catalog/scalar-type.ts'
import { planBlock } from '../../src/plan/block.ts'
import { type Cut, cutStatement } from '../../src/plan/cut.ts'
import { type Limits, noLimits } from '../../src/plan/limits.ts'
import type { ReleasePlan } from '../../src/plan/release-plan.ts'
import type { DataColumn, DataSet, DataTable, PrivateTable, PublishedTable } from '../../src/policy/data-set.ts'
import type { Parser } from '../../src/sql/parser.ts'

function type(printed: string): CatalogType {
  const name = printedType(printed)?.name ?? printed
  return { schema: 'pg_catalog', name, printed, modifier: -1, kind: 'base', labels: [] }
}

type Declared = Partial<Pick<DataColumn, 'clamp' | 'step' | 'values' | 'valuesFrom' | 'notNull' | 'role' | 'deterministic'>>

function column(name: string, printed: string, declared: Declared = {}): readonly [string, DataColumn] {
  return [
    name,
    { name, type: type(printed), notNull: false, deterministic: true, role: 'listed', clamp: null, step: null, values: null, valuesFrom: null, ...declared },
  ]
}

function privateTable(name: string, more: Partial<PrivateTable>, columns: readonly (readonly [string, DataColumn])[]): DataTable {
  return {
    kind: 'private',
    schema: 'public',
    name,
    owner: { kind: 'column', column: 'rider_id' },
    bounds: { groups: 1, rows: 1 },
    onePerPerson: false,
    uniqueKeys: [],
    primaryKey: null,
    ...more,
    columns: new Map(columns),
  }
}

function publishedTable(name: string, more: Partial<PublishedTable>, columns: readonly (readonly [string, DataColumn])[]): DataTable {
  return { kind: 'published', schema: 'public', name, uniqueKeys: [], primaryKey: null, ...more, columns: new Map(columns) }
}

const linking: Declared = { role: 'linking', notNull: true }

const tables: readonly DataTable[] = [
  privateTable('riders', { onePerPerson: true, uniqueKeys: [['rider_id']], primaryKey: ['rider_id'] }, [
    column('rider_id', 'integer', linking),
    column('birth_year', 'integer', { clamp: ['1920', '2020'], step: '1' }),
    column('district', 'text', { values: ['Northbank', 'Eastquay'], notNull: true }),
    column('concession', 'boolean', { notNull: true }),
    column('nickname', 'text', { deterministic: false }),
    column('profile', 'jsonb'),
  ]),
  privateTable('trips', { bounds: { groups: 12, rows: 20 }, uniqueKeys: [['trip_id']], primaryKey: ['trip_id'] }, [
    column('trip_id', 'integer', linking),
    column('rider_id', 'integer', linking),
    column('boarded_at', 'timestamp with time zone', { clamp: ['2025-01-01 00:00:00+00', '2027-01-01 00:00:00+00'], notNull: true }),
    column('from_pier', 'integer', { valuesFrom: { table: 'public.piers', column: 'pier_id' }, notNull: true }),
    column('fare_pence', 'integer', { clamp: ['0', '2500'], step: '1' }),
    column('delay_min', 'real', { clamp: ['0', '120'], step: '0.5' }),
    column('weight', 'double precision'),
    column('big', 'bigint'),
    column('note', 'text'),
    column('rested', 'interval'),
  ]),
  privateTable(
    'complaints',
    {
      bounds: { groups: 3, rows: 2 },
      owner: { kind: 'through', steps: [{ column: 'trip_id', table: 'public.trips', referenced: 'trip_id' }], person: 'rider_id' },
      uniqueKeys: [['complaint_id']],
      primaryKey: ['complaint_id'],
    },
    [column('complaint_id', 'integer', { notNull: true }), column('trip_id', 'integer', linking), column('topic', 'text', { notNull: true })],
  ),
  publishedTable('piers', { uniqueKeys: [['pier_id']], primaryKey: ['pier_id'] }, [
    column('pier_id', 'integer', { notNull: true }),
    column('name', 'text', { notNull: true }),
    column('zone', 'integer', { notNull: true }),
  ]),
  publishedTable('tides', {}, [column('pier_id', 'integer'), column('height', 'numeric(4,1)')]),
]

/** The ferry company as a policy that fits, by hand: what the planner works from. */
export const ferries: DataSet = {
  name: 'ferries',
  policyHash: '0'.repeat(64),
  schema: 'public',
  personCalled: 'rider',
  personTable: 'public.riders',
  personColumn: 'rider_id',
  personType: type('integer'),
  defaults: { epsilon: '0.1', delta: '1e-8' },
  replyAfterMs: 300,
  personKey: '1/public.riders.rider_id',
  tables: new Map(tables.map((table) => [`${table.schema}.${table.name}`, table])),
  hasUndeclaredKeys: true,
}

export interface Planned {
  readonly cut: Cut
  readonly plans: readonly ReleasePlan[]
}

/** Reads, cuts and plans one statement; every parameter is an integer. Throws the refusal. */
export async function planned(parser: Parser, sql: string, limits: Limits = noLimits, parameterType: ScalarType = scalarType('int4')): Promise<Planned> {
  const outcome = await parser.readText(sql)
  if (outcome.kind !== 'read') throw new Error(outcome.message)
  const [placed] = outcome.statements
  if (placed === undefined || placed.refusal !== null) throw new Error(`not read: ${placed?.refusal?.code ?? 'nothing'}`)
  const cut = cutStatement(placed.statement, ferries)
  const plans = cut.blocks.map((block) =>
    planBlock(
      block.query,
      {
        dataSet: ferries,
        parameters: block.parameters.map(() => ({ type: parameterType, value: undefined })),
        now: '2026-12-01T00:00:00+00:00',
        timeZone: 'UTC',
        commonTables: new Map(),
        scans: [],
      },
      limits,
    ),
  )
  return { cut, plans }
}
