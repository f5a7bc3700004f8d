import { printQuery } from '../sql/print.ts'
import { refuse } from '../base/refusal.ts'
import { fixedExpressions, fixedSql, fixedValues } from '../bound/fixed-sql.ts'
import { countSql, listSql } from '../bound/list-sql.ts'
import { type FixedValues, noFixedValues } from '../bound/print-scalar.ts'
import { scalarsOf } from '../bound/print-source.ts'
import { groupsTouched } from '../bound/reach.ts'
import { listedRows } from '../plan/fan-out.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import { weightOf } from '../plan/weight.ts'
import type { KeyTexts } from '../release/release.ts'
import type { Lobby } from './ports.ts'

const groupCeiling = 10_000
/** Work on each row, see `weightOf`: beyond it no time class hides whether there was a row. */
const mostWork = 1500

/** What the lobby knows of a block before anything is debited: the statement's own values, the list of groups, and how many of them a person can touch. */
export interface Prepared {
  readonly fixed: FixedValues
  readonly listed: readonly KeyTexts[] | null
  readonly groups: bigint
}

/** Asks the lobby; everything here is published or the statement's own. Refuses lists above the ceiling. */
export async function prepare(plan: ReleasePlan, timeZone: string, lobby: Lobby): Promise<Prepared> {
  if (weightOf(scalarsOf(plan)) > mostWork) refuse('expr.unsupported', { what: 'so much work on each row' })
  const fixed = await computeFixed(plan, timeZone, lobby)
  for (const scan of plan.fanOut.counted) await countRows(plan, scan, listedRows, fixed, timeZone, lobby)
  for (const scan of plan.scans)
    if (scan.table.kind === 'listed' && scan.table.source.kind === 'series') await countRows(plan, scan.index, BigInt(groupCeiling), fixed, timeZone, lobby)
  const listed = plan.groups.kind === 'listed' ? await listGroups(plan, fixed, timeZone, lobby) : null
  return { fixed, listed, groups: groupsTouched(plan, listed === null ? null : BigInt(listed.length || 1)) }
}

/** Refuses a published side with more rows than the ceiling: how long the vault works through it must not hang on whether somebody's row meets it. */
async function countRows(plan: ReleasePlan, scan: number, ceiling: bigint, fixed: FixedValues, timeZone: string, lobby: Lobby): Promise<void> {
  const rows = await lobby.published(plan.dataSet.name, printQuery(countSql(plan, scan, ceiling, fixed)), [], timeZone, 1)
  const count = rows === 'too-many' ? null : (rows[0]?.[0] ?? null)
  if (count === null || BigInt(count) > ceiling) refuse('join.fan-out', { ceiling: ceiling.toString() })
}

async function computeFixed(plan: ReleasePlan, timeZone: string, lobby: Lobby): Promise<FixedValues> {
  const expressions = fixedExpressions(plan)
  if (expressions.length === 0) return noFixedValues
  const rows = await lobby.published(plan.dataSet.name, printQuery(fixedSql(expressions)), [], timeZone, 1)
  return fixedValues(expressions, rows === 'too-many' ? [] : (rows[0] ?? []))
}

async function listGroups(plan: ReleasePlan, fixed: FixedValues, timeZone: string, lobby: Lobby): Promise<readonly KeyTexts[]> {
  const rows = await lobby.published(plan.dataSet.name, printQuery(listSql(plan, fixed)), [], timeZone, groupCeiling)
  return rows === 'too-many' ? refuse('keys.too-many', { count: (groupCeiling + 1).toString(), ceiling: groupCeiling.toString() }) : rows
}
