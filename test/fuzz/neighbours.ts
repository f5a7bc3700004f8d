import pg from 'pg'
import { Refusal } from '../../src/base/refusal.ts'
import { BoundedQuery } from '../../src/bound/bounded-query.ts'
import type { Draw } from '../../src/bound/bounded-sql.ts'
import { fixedExpressions, fixedSql, fixedValues } from '../../src/bound/fixed-sql.ts'
import { countSql, listSql } from '../../src/bound/list-sql.ts'
import { type FixedValues, noFixedValues } from '../../src/bound/print-scalar.ts'
import { coordinatesOf, groupsTouched, reachOf } from '../../src/bound/reach.ts'
import { planBlock } from '../../src/plan/block.ts'
import { cutStatement } from '../../src/plan/cut.ts'
import { listedRows } from '../../src/plan/fan-out.ts'
import type { Limits } from '../../src/plan/limits.ts'
import type { ReleasePlan } from '../../src/plan/release-plan.ts'
import { openText } from '../../src/plan/rewrite.ts'
import type { DataSet } from '../../src/policy/data-set.ts'
import { fit } from '../../src/policy/fit.ts'
import { readDataSetFile } from '../../src/policy/read.ts'
import { exactRow } from '../../src/release/exact.ts'
import { sameTree } from '../../src/sql/equal.ts'
import { createParser, type Parser } from '../../src/sql/parser.ts'
import { printQuery } from '../../src/sql/print.ts'
import type { Query } from '../../src/sql/tree.ts'
import { readCatalog } from '../../src/vault/catalog.ts'
import { createSql, policyOf, type Rows, tablesOf, typeOf, type World } from './worlds.ts'

/** Exact totals by the text of their group's keys. */
type Totals = ReadonlyMap<string, readonly bigint[]>

/** One person, or nobody (null): the rows that belong to no one must count for nothing. */
export type Who = string | null

export interface Loaded {
  readonly world: World
  readonly schema: string
  readonly dataSet: DataSet
  /** Schemas without that person, in another physical order, and with that person alone. */
  readonly neighbours: readonly { readonly who: Who; readonly without: string; readonly alone: string }[]
}

/** A block as it would be asked of the vault. */
export interface Asked {
  readonly plan: ReleasePlan
  readonly fixed: FixedValues
  readonly listed: ReadonlySet<string> | null
  readonly groups: bigint
  readonly draw: Draw
  readonly query: { readonly text: string; readonly tree: Query; readonly keyCount: number; readonly totalCount: number }
}

export type Verdict = { readonly kind: 'sound' } | { readonly kind: 'violation'; readonly what: string }

export type Reading =
  | { readonly kind: 'asked'; readonly blocks: readonly Asked[] }
  | { readonly kind: 'refused'; readonly why: string }
  | { readonly kind: 'broken'; readonly why: string }

const settings = `SET datestyle = 'ISO'; SET intervalstyle = 'postgres'; SET extra_float_digits = 1; SET standard_conforming_strings = on; SET jit = off; SET statement_timeout = '60s'; SET client_min_messages = 'error'`
/** The vault's planner is free to run the same text in another way over other rows. */
const otherWays = `${settings}; SET enable_hashagg = off; SET enable_hashjoin = off; SET enable_seqscan = off; SET work_mem = '1MB'`

export const timeZones = ['UTC', 'Europe/Paris', 'America/St_Johns', 'Pacific/Apia', 'Asia/Kathmandu'] as const

/** A PostgreSQL with many small data sets, each beside its neighbours. */
export class Harbour {
  readonly #here: pg.Client
  readonly #there: pg.Client
  readonly #parser: Parser
  #schemas = 0
  /** PostgreSQL has infinite intervals from 17 on. */
  readonly #endless: string

  private constructor(here: pg.Client, there: pg.Client, version: number) {
    this.#endless = version < 170_000 ? '178000000 years' : 'infinity'
    this.#here = here
    this.#there = there
    this.#parser = createParser()
  }

  static async open(url: string): Promise<Harbour> {
    const text = { getTypeParser: () => (value: string) => value } as unknown as pg.CustomTypesConfig
    const clients = [new pg.Client({ connectionString: url, types: text }), new pg.Client({ connectionString: url, types: text })] as const
    for (const client of clients) await client.connect()
    await clients[0].query(settings)
    await clients[1].query(otherWays)
    await clients[0].query(`CREATE SCHEMA fuzz_kinds; CREATE TYPE fuzz_kinds.sky AS ENUM ('fog', 'calm', 'gale');
       CREATE COLLATION fuzz_kinds.caseless (provider = icu, locale = 'und-u-ks-level2', deterministic = false)`)
    const { rows } = await clients[0].query<{ version: string }>(`SELECT current_setting('server_version_num') AS version`)
    return new Harbour(...clients, Number(rows[0]?.version))
  }

  async close(): Promise<void> {
    await Promise.all([this.#here.end(), this.#there.end(), this.#parser.close()])
  }

  async load(world: World, rows: Rows, persons: readonly Who[]): Promise<Loaded> {
    this.#schemas += 1
    const schema = `fuzz_d${this.#schemas.toString()}`
    await this.#here.query(createSql(world, schema))
    for (const table of tablesOf(world)) {
      const given = rows[table.name] ?? []
      const names = table.columns.map((each) => each.name)
      const types = table.columns.map((each) => `${typeOf(world, each.kind)}[]`)
      if (given.length > 0)
        await this.#here.query(
          `INSERT INTO ${schema}.${table.name} (${names.join(', ')}) SELECT * FROM unnest(${types.map((type, i) => `$${(i + 1).toString()}::${type}`).join(', ')})`,
          table.columns.map((column, i) => given.map((row) => (column.kind === 'interval' && row[i] === 'infinity' ? this.#endless : (row[i] ?? null)))),
        )
    }
    const neighbours = []
    for (const [i, who] of persons.entries()) {
      const [without, alone] = [`${schema}_m${i.toString()}`, `${schema}_p${i.toString()}`]
      for (const name of [without, alone]) await this.#here.query(createSql(world, name))
      for (const table of tablesOf(world)) {
        const from = `${schema}.${table.name}`
        const columns = table.columns.map((each) => each.name).join(', ')
        const whose = who === null ? table.ownedByNobody : (table.ownedBy?.replaceAll('$p', `${pg.escapeLiteral(who)}::${typeOf(world, 'person')}`) ?? null)
        const test = whose === null ? null : `coalesce(${whose.replaceAll('{s}', schema)}, false)`
        const copy = async (to: string, where: string, order: string): Promise<unknown> =>
          this.#here.query(`INSERT INTO ${to}.${table.name} SELECT ${columns} FROM ${from} x${where}${order}`)
        await copy(without, test === null ? '' : ` WHERE NOT ${test}`, test === null ? '' : ` ORDER BY md5(x::text || '${i.toString()}')`)
        await copy(alone, test === null ? '' : ` WHERE ${test}`, '')
      }
      neighbours.push({ who, without, alone })
    }
    return { world, schema, dataSet: await this.#dataSet(schema), neighbours }
  }

  async drop(loaded: Loaded): Promise<void> {
    for (const name of [loaded.schema, ...loaded.neighbours.flatMap((each) => [each.without, each.alone])])
      await this.#here.query(`DROP SCHEMA ${name} CASCADE`)
  }

  async #dataSet(schema: string): Promise<DataSet> {
    const catalog = await readCatalog(this.#here as never, [schema])
    const draft = readDataSetFile(policyOf(schema), 'ferries.yaml')
    if (draft.kind === 'complaints') throw new Error(JSON.stringify(draft.complaints))
    const outcome = fit(draft.value, catalog)
    if (outcome.kind === 'complaints') throw new Error(JSON.stringify(outcome.complaints))
    return outcome.value
  }

  /** The statement's blocks, planned and printed as an answer would be; `salt` makes the salts. */
  async read(sql: string, loaded: Loaded, timeZone: string, limits: Limits, salt: () => bigint): Promise<Reading> {
    await this.#here.query(`SET timezone = '${timeZone}'; SET search_path = ${loaded.schema}`)
    try {
      const outcome = await this.#parser.readText(sql)
      if (outcome.kind === 'syntax-error') return { kind: 'broken', why: `${outcome.message}: ${sql}` }
      const [only] = outcome.statements
      if (only === undefined) return { kind: 'broken', why: 'no statement' }
      if (only.refusal !== null) return { kind: 'refused', why: only.refusal.code }
      const blocks: Asked[] = []
      for (const block of cutStatement(only.statement, loaded.dataSet).blocks) {
        const text = openText(block)
        await this.#here.query(`PREPARE fuzz AS ${text}`)
        await this.#here.query('DEALLOCATE fuzz')
        const read = await this.#parser.readText(text)
        const query = read.kind === 'read' && read.statements[0]?.statement.kind === 'query' ? read.statements[0].statement.query : null
        if (query === null) return { kind: 'broken', why: 'a block that does not read' }
        blocks.push(await this.#ask(query, loaded, timeZone, limits, salt))
      }
      return { kind: 'asked', blocks }
    } catch (problem) {
      if (problem instanceof Refusal) return { kind: 'refused', why: problem.code }
      // PostgreSQL's own complaint about the statement's own values or published data
      if (problem instanceof pg.DatabaseError && /^(22|42|0A|54)/.test(problem.code ?? '')) return { kind: 'refused', why: `lobby ${problem.code ?? ''}` }
      return { kind: 'broken', why: problem instanceof Error ? (problem.stack ?? problem.message) : String(problem) }
    } finally {
      await this.#here.query('SET search_path = pg_catalog')
    }
  }

  async #ask(query: Query, loaded: Loaded, timeZone: string, limits: Limits, salt: () => bigint): Promise<Asked> {
    const context = { dataSet: loaded.dataSet, parameters: [], now: '2026-01-15T12:00:00+00:00', timeZone, commonTables: new Map(), scans: [] }
    const plan = planBlock(query, context, limits)
    await this.#here.query('SET search_path = pg_catalog')
    const expressions = fixedExpressions(plan)
    const fixed =
      expressions.length === 0 ? noFixedValues : fixedValues(expressions, (await this.#rows(this.#here, printQuery(fixedSql(expressions))))[0] ?? [])
    for (const scan of plan.fanOut.counted) {
      const [row] = await this.#rows(this.#here, printQuery(countSql(plan, scan, listedRows, fixed)))
      if (BigInt(row?.[0] ?? '0') > listedRows) throw new Refusal('join.fan-out', { ceiling: listedRows.toString() }, -1)
    }
    const listed = plan.groups.kind === 'listed' ? await this.#rows(this.#here, printQuery(listSql(plan, fixed))) : null
    if (listed !== null && listed.length > 10_000) throw new Refusal('keys.too-many', { count: '10001', ceiling: '10000' }, -1)
    const groups = groupsTouched(plan, listed === null ? null : BigInt(listed.length || 1))
    const chooses = !plan.oneGroupByNature && !(listed !== null && BigInt(listed.length) <= plan.groupsPerPerson)
    const draw = { keep: chooses ? plan.groupsPerPerson : null, salts: Array.from({ length: plan.keys.length + 1 }, salt) }
    const bounded = BoundedQuery.of(plan, fixed, draw)
    const echo = await this.#parser.readText(bounded.text)
    const echoed =
      echo.kind === 'read' &&
      echo.statements[0]?.refusal === null &&
      echo.statements[0].statement.kind === 'query' &&
      sameTree(echo.statements[0].statement.query, bounded.tree)
    if (!echoed) throw new Error(`the vault's SQL does not read as its tree: ${bounded.text}`)
    return { plan, fixed, listed: listed === null ? null : new Set(listed.map((row) => JSON.stringify(row))), groups, draw, query: bounded }
  }

  async #rows(client: pg.Client, text: string): Promise<readonly (readonly (string | null)[])[]> {
    const { rows } = await client.query<(string | null)[]>({ text, rowMode: 'array' })
    return rows
  }

  async #totals(client: pg.Client, asked: Asked, from: string, to: string): Promise<Totals> {
    const rows = await this.#rows(client, asked.query.text.replaceAll(`${from}.`, `${to}.`))
    const totals = new Map<string, readonly bigint[]>()
    for (const row of rows) {
      const { keys, values } = exactRow(row, asked.query.keyCount, asked.query.totalCount)
      const key = JSON.stringify(keys)
      if (totals.has(key)) throw new Error(`the vault gives the group ${key} twice`)
      if (asked.listed === null || asked.listed.has(key)) totals.set(key, values)
    }
    return totals
  }

  /**
   * What must hold of a block over D, D without a person and that person alone: the totals add up (each row is a function of one person's rows), and the
   * person moves no more groups, and none of them further, than the plan says.
   */
  async compare(asked: Asked, loaded: Loaded, reach: ReleasePlan, groups: bigint, onCase: () => void): Promise<Verdict> {
    try {
      const all = await this.#totals(this.#here, asked, loaded.schema, loaded.schema)
      for (const { who, without, alone } of loaded.neighbours) {
        onCase()
        const [rest, own] = [await this.#totals(this.#there, asked, loaded.schema, without), await this.#totals(this.#here, asked, loaded.schema, alone)]
        const what = compareTotals(all, rest, own, reach, groups, who)
        if (what !== null) return { kind: 'violation', what: `${who === null ? 'nobody' : `person ${who}`}: ${what}` }
      }
      return { kind: 'sound' }
    } catch (problem) {
      return {
        kind: 'violation',
        what: `the vault raised ${problem instanceof pg.DatabaseError ? `${problem.code ?? ''} ${problem.message}` : String(problem)}`,
      }
    }
  }

  /** Sets the session's time zone on both connections: the same for the statement and its neighbours. */
  async inZone(timeZone: string): Promise<void> {
    for (const client of [this.#here, this.#there]) await client.query(`SET timezone = '${timeZone}'; SET search_path = pg_catalog`)
  }
}

const size = (value: bigint): bigint => (value < 0n ? -value : value)

function compareTotals(all: Totals, rest: Totals, own: Totals, plan: ReleasePlan, groups: bigint, who: Who): string | null {
  let changed = 0n
  const moved = plan.totals.map(() => 0n)
  for (const key of new Set([...all.keys(), ...rest.keys(), ...own.keys()])) {
    const [a, b, c] = [all.get(key), rest.get(key), own.get(key)]
    const width = (a ?? b ?? c ?? []).length
    const difference = Array.from({ length: width }, (_, i) => (a?.[i] ?? 0n) - (b?.[i] ?? 0n))
    const mine = Array.from({ length: width }, (_, i) => c?.[i] ?? 0n)
    if (difference.some((value, i) => value !== mine[i])) return `group ${key} moves by ${difference.join(', ')}, the person alone has ${mine.join(', ')}`
    if (plan.keys.length > 0 && (a === undefined) !== (b === undefined) && c === undefined) return `group ${key} comes or goes, but the person is not in it`
    if (difference.every((value) => value === 0n) && (c === undefined || plan.keys.length === 0)) continue
    if (who === null) return `rows of nobody move group ${key}`
    changed += 1n
    let at = 0
    for (const [i, total] of plan.totals.entries()) {
      const parts = difference.slice(at, at + coordinatesOf(total))
      at += parts.length
      const move = parts.reduce((sum, part) => sum + size(part), 0n)
      moved[i] = (moved[i] ?? 0n) + move
      if (move > reachOf(total))
        return `total ${i.toString()} (${total.kind}) of group ${key} moves by ${move.toString()}, stated are ${reachOf(total).toString()}`
    }
  }
  if (changed > groups) return `${changed.toString()} groups change, stated are ${groups.toString()}`
  for (const [i, total] of plan.totals.entries())
    if ((moved[i] ?? 0n) > groups * reachOf(total)) return `total ${i.toString()} moves by ${String(moved[i])} over all groups`
  return null
}
