import sqlParser from 'node-sql-parser'
import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { check } from '../../src/base/check.ts'
import { readColumns } from '../../src/bound/print-source.ts'
import { printedType } from '../../src/catalog/scalar-type.ts'
import { planBlock } from '../../src/plan/block.ts'
import { cutStatement } from '../../src/plan/cut.ts'
import { noLimits } from '../../src/plan/limits.ts'
import { createParser, type Parser } from '../../src/sql/parser.ts'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'
import { type Case, readCases } from './case-file.ts'
import { ferryPolicy, ferryVault } from './ferry.ts'

/** The vault's SQL of a case, statement by statement, and what its plan says it reads. */
interface Asked {
  readonly name: string
  readonly sql: string
  /** schema.table.column, sorted, once each. */
  readonly reads: readonly string[]
}

const reader = new sqlParser.Parser()
const asked: Asked[] = []
let server: TestHedgerow
let parser: Parser

beforeAll(async () => {
  server = await testHedgerow({
    vault: ferryVault,
    policy: ferryPolicy,
    analysts: { ana: '{ epsilon: 1e33, delta: 1e-3, renews: never }' },
    everyone: '{ epsilon: 1e33, delta: 1e-3 }',
  })
  parser = createParser()
  const client = await server.connect('ana')
  for (const each of readCases()) if (each.refused === null) asked.push(...(await askedOf(each, client)))
})
afterAll(async () => {
  await parser.close()
  await server.stop()
})

/** The query inside a command that EXPLAIN does not take. */
function queryIn(text: string): string {
  const copy = /^COPY \((.*)\) TO STDOUT.*$/s.exec(text)
  if (copy !== null) return copy[1] ?? ''
  return text
    .replace(/^(?:CREATE TEMP (?:TABLE|VIEW) \w+ AS|PREPARE \w+(?:\([^)]*\))? AS|DECLARE \w+ CURSOR FOR|INSERT INTO \w+(?: \([^)]*\))?)\s+/, '')
    .replace(/\bINTO TEMP \w+/, '')
}

async function askedOf(each: Case, client: pg.Client): Promise<readonly Asked[]> {
  const all: Asked[] = []
  for (const text of each.statements) {
    const query = queryIn(text)
    if (!/^(?:SELECT|WITH|VALUES|\()/.test(query) || /^SELECT .*? FROM (?:per_kind|per_concession|notes|liked)\b/.test(query)) continue
    const { rows } = await client.query<{ 'QUERY PLAN': string }>(`EXPLAIN VERBOSE ${query}`, valuesOf(query, each))
    const vault = rows.flatMap((row) => (row['QUERY PLAN'].startsWith('  Vault: ') ? [row['QUERY PLAN'].slice('  Vault: '.length)] : []))
    const plans = await plansOf(query, each)
    check(plans.length === vault.length, `${each.name} has a plan for each question to the vault`)
    all.push(...vault.map((sql, i) => ({ name: each.name, sql, reads: plans[i] ?? [] })))
  }
  return all
}

/** A value for each of the statement's parameters; a prepared statement's own are numbers. */
function valuesOf(query: string, each: Case): (string | null)[] | undefined {
  const count = new Set(query.match(/\$\d+/g) ?? []).size
  return count === 0 ? undefined : Array.from({ length: count }, (_, i) => each.parameters[i]?.value ?? (each.parameters.length > 0 ? null : '1'))
}

/** What each block of a statement reads, by its plan. */
async function plansOf(text: string, each: Case): Promise<readonly (readonly string[])[]> {
  const dataSet = server.hedgerow.policies().dataSets.get('ferries')
  check(dataSet !== undefined, 'the data set is loaded')
  const outcome = await parser.readText(text)
  check(outcome.kind === 'read', `${each.name} can be read`)
  const [placed] = outcome.statements
  check(placed?.refusal === null, `${each.name} can be read`)
  const types = each.parameters.map((parameter) => printedType(parameter.type) ?? printedType('integer'))
  return cutStatement(placed.statement, dataSet).blocks.map((block) => {
    const parameters = block.parameters
      .map((number) => ({ type: types[number - 1] ?? printedType('integer'), value: null }))
      .flatMap(({ type, value }) => (type === null ? [] : [{ type, value }]))
    const plan = planBlock(
      block.query,
      { dataSet, parameters, now: '2026-01-01T00:00:00+00:00', timeZone: 'UTC', commonTables: new Map(), scans: [] },
      noLimits,
    )
    const read = readColumns(plan)
    const names = plan.scans.flatMap((scan) => {
      const table = scan.table
      return table.kind === 'listed'
        ? []
        : [`${table.schema}.${table.name}`, ...[...(read.get(scan.index) ?? [])].map((column) => `${table.schema}.${table.name}.${column}`)]
    })
    return [...new Set(names)].sort()
  })
}

type Node = Readonly<Record<string, unknown>>

function* nodesIn(value: unknown): Generator<Node> {
  if (Array.isArray(value)) for (const each of value) yield* nodesIn(each)
  else if (typeof value === 'object' && value !== null) {
    yield value as Node
    for (const each of Object.values(value)) yield* nodesIn(each)
  }
}

/** What of PostgreSQL the second reader does not know, and what stands in for it: casts, functions with a schema, and three operators. No table and no column is touched. */
const dialect: readonly (readonly [RegExp, string])[] = [
  [/::(?:\w+\.)?(?:"[^"]+"|\w+)/g, ''],
  [/\bpg_catalog\./g, ''],
  [/\bIS NOT DISTINCT FROM\b/g, '='],
  [/\bIS DISTINCT FROM\b/g, '<>'],
  [/ # /g, ' + '],
]

/** What the second reader finds in a text: its tables, and the columns read of each. */
function readBySecond(sql: string): readonly string[] {
  const ast = reader.astify(
    dialect.reduce((text, [from, to]) => text.replace(from, to), sql),
    { database: 'postgresql' },
  )
  const nodes = [...nodesIn(ast)]
  const tables = nodes.flatMap((node) =>
    typeof node['table'] === 'string' && typeof node['db'] === 'string'
      ? [{ alias: typeof node['as'] === 'string' ? node['as'] : node['table'], name: `${node['db']}.${node['table']}` }]
      : [],
  )
  const columns = nodes.flatMap((node) => {
    if (node['type'] !== 'column_ref') return []
    const table = tables.find((each) => each.alias === node['table'])
    return table === undefined ? [] : [`${table.name}.${columnName(node['column'])}`]
  })
  return [...new Set([...tables.map((table) => table.name), ...columns])].sort()
}

function columnName(column: unknown): string {
  if (typeof column === 'string') return column
  for (const node of nodesIn(column)) if (typeof node['value'] === 'string') return node['value']
  return '?'
}

/** Texts it cannot read, with the reason; a case that joins them must be named here. */
const unread: readonly (readonly [name: string, reason: string])[] = []

test('a second reader of SQL finds in the vault’s text exactly the tables and columns that the plan says are read', () => {
  const failed: string[] = []
  for (const each of asked) {
    const found = attempt(each.sql)
    if (found === null) failed.push(each.name)
    else expect(found, `${each.name}: ${each.sql}`).toEqual(each.reads)
  }
  expect(failed).toEqual(unread.map(([name]) => name))
  expect(asked.length).toBeGreaterThanOrEqual(200)
  const silent = readCases().filter((each) => each.refused === null && !each.free && !asked.some((other) => other.name === each.name))
  expect(silent.map((each) => each.name)).toEqual([])
})

test('a column or a table that the plan does not speak of is noticed by the second reader', () => {
  const each = asked.find((other) => other.reads.includes('public.trips.fare_pence'))
  expect(each).toBeDefined()
  const sql = each?.sql ?? ''
  expect(readBySecond(sql)).toEqual(each?.reads)
  expect(readBySecond(sql.replaceAll('.fare_pence', '.secret'))).not.toEqual(each?.reads)
  expect(readBySecond(sql.replaceAll('public.trips', 'public.riders'))).not.toEqual(each?.reads)
  expect(readBySecond(`${sql} UNION ALL SELECT s0.secret FROM public.trips AS s0`)).not.toEqual(each?.reads)
})

function attempt(sql: string): readonly string[] | null {
  try {
    return readBySecond(sql)
  } catch {
    return null
  }
}
