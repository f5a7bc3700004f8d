import type { FuzzStatement } from './statements.ts'
import type { Rows } from './worlds.ts'

/** Tries smaller statements as long as `fails` says that one still does; at most `tries` questions. */
export async function shrinkStatement(statement: FuzzStatement, fails: (statement: FuzzStatement) => Promise<boolean>, tries = 60): Promise<FuzzStatement> {
  let [smallest, left] = [statement, tries]
  for (let changed = true; changed && left > 0;) {
    changed = false
    for (const part of ['totals', 'keys', 'where'] as const)
      for (let i = smallest[part].length - 1; i >= 0 && left > 0; i -= 1) {
        if (part === 'totals' && smallest.totals.length === 1) break
        const candidate = { ...smallest, [part]: smallest[part].filter((_, at) => at !== i) }
        left -= 1
        if (!(await fails(candidate))) continue
        smallest = candidate
        changed = true
      }
  }
  return smallest
}

/** Tries fewer rows, halves of each table first. */
export async function shrinkRows(rows: Rows, fails: (rows: Rows) => Promise<boolean>, tries = 80): Promise<Rows> {
  let [smallest, left] = [rows, tries]
  for (const name of Object.keys(rows)) {
    for (let size = smallest[name]?.length ?? 0; size >= 1 && left > 0; size = size === 1 ? 0 : Math.ceil(size / 2)) {
      for (let from = 0; from < (smallest[name]?.length ?? 0) && left > 0;) {
        const candidate: Rows = { ...smallest, [name]: (smallest[name] ?? []).filter((_, i) => i < from || i >= from + size) }
        left -= 1
        if (await fails(candidate)) smallest = candidate
        else from += size
      }
    }
  }
  return smallest
}
