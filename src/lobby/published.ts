import type pg from 'pg'
import { copyThrough } from './copy-through.ts'
import { literal, name, names, qualified } from './quote.ts'
import type { TablePlan } from './table-plan.ts'

const stage = 'hedgerow_stage'

/** Copies a published table of the vault beside the one in use, with its indexes and statistics; `vault` is in its read-only transaction. */
export async function stagePublished(vault: pg.Client, lobby: pg.Client, plan: TablePlan, at: number): Promise<void> {
  const relation = stageName(at)
  await lobby.query(plan.createAs(stage, relation))
  const columns = names(plan.columns.map((column) => column.name))
  if (plan.columns.length > 0) {
    await copyThrough(
      vault,
      `COPY (SELECT ${columns} FROM ${qualified(plan.schema, plan.name)}) TO STDOUT (FORMAT text)`,
      lobby,
      `COPY ${qualified(stage, relation)} (${columns}) FROM STDIN (FORMAT text)`,
    )
  }
  for (const [number, index] of plan.indexes.entries()) await lobby.query(index.createOn(stage, relation, `${relation}_${number}`))
  await lobby.query(`ANALYZE ${qualified(stage, relation)}`)
}

/** Puts the staged copy in the place of the old one; inside the transaction of the load. */
export async function swapPublished(lobby: pg.Client, plan: TablePlan, at: number): Promise<void> {
  const relation = stageName(at)
  await dropRelation(lobby, plan.schema, plan.name)
  await lobby.query(`ALTER TABLE ${qualified(stage, relation)} SET SCHEMA ${name(plan.schema)}`)
  await lobby.query(`ALTER TABLE ${qualified(plan.schema, relation)} RENAME TO ${name(plan.name)}`)
  for (const [number, index] of plan.indexes.entries())
    await lobby.query(`ALTER INDEX ${qualified(plan.schema, `${relation}_${number}`)} RENAME TO ${name(index.name)}`)
}

/** Drops what this name stands for, with the temporary views that analysts built on it. */
export async function dropRelation(lobby: pg.Client, schema: string, relation: string): Promise<void> {
  await lobby.query(`DROP TABLE IF EXISTS ${qualified(schema, relation)} CASCADE`)
}

function stageName(at: number): string {
  return `hedgerow_copy_${at}`
}

/** The row-security policy of a shell: any scan is refused, whatever the session sets. */
export function closeShellTexts(plan: TablePlan): readonly string[] {
  const shell = qualified(plan.schema, plan.name)
  return [
    `CREATE POLICY people_stay_inside ON ${shell} USING (hedgerow_inside.no_scan(${literal(`${plan.schema}.${plan.name}`)}))`,
    `ALTER TABLE ${shell} ENABLE ROW LEVEL SECURITY`,
    `ALTER TABLE ${shell} FORCE ROW LEVEL SECURITY`,
  ]
}
