import { refuse } from '../base/refusal.ts'
import { exampleFor, exampleOf } from '../plan/example.ts'
import { findTable } from '../plan/names.ts'
import type { DataSet, PrivateTable } from '../policy/data-set.ts'
import type { Placed } from '../sql/tree.ts'

/** Statements that are no queries and may not touch a private table, by the parser's tag, with their name for people. */
const closed: Readonly<Record<string, string>> = {
  MergeStmt: 'MERGE',
  LockStmt: 'LOCK',
  CopyStmt: 'COPY of a table',
  InsertStmt: 'INSERT',
  UpdateStmt: 'UPDATE',
  DeleteStmt: 'DELETE',
  TruncateStmt: 'TRUNCATE',
  CreateFunctionStmt: 'CREATE FUNCTION',
  RuleStmt: 'CREATE RULE',
  CreateTrigStmt: 'CREATE TRIGGER',
  DoStmt: 'a DO block',
}

/** Private tables a statement names, as far as the parser sees them. */
export function privateTables(placed: Placed, dataSet: DataSet): readonly PrivateTable[] {
  return placed.relations.flatMap((name) => {
    const table = findTable(dataSet, name)
    return table?.kind === 'private' ? [table] : []
  })
}

/** The first relation of a CREATE TABLE is the one it makes; a schema before it, such as pg_temp, makes it no other name for those who read it bare. */
function refuseShadow(placed: Placed, dataSet: DataSet): void {
  const table = findTable(dataSet, placed.relations[0]?.slice(-1) ?? [])
  if (table?.kind === 'private') refuse('rows.shadow', { table: table.name, example: exampleOf(dataSet, table) })
}

/** Refuses what would write to, lock or copy a private table, or hide its name behind a function; lets other commands go to PostgreSQL. */
export function refuseClosed(placed: Placed, tables: readonly PrivateTable[], mentioned: boolean, dataSet: DataSet): void {
  if (placed.statement.kind !== 'other') return
  const { tag } = placed.statement
  const [table] = tables
  if (tag === 'CreateStmt') refuseShadow(placed, dataSet)
  const what = closed[tag]
  if (what === undefined) return
  const body = tag === 'CreateFunctionStmt' || tag === 'DoStmt'
  if (table !== undefined) refuse('rows.locked', { what, table: table.name, example: exampleOf(dataSet, table) })
  if (body && mentioned) refuse('rows.locked', { what, table: 'named in it', example: exampleFor(dataSet, null) })
}
