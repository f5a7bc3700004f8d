import type pg from 'pg'
import type { DemoStatement } from './statements.ts'

type Cell = string | null

/** A table in the manner of a terminal: columns padded, numbers as PostgreSQL prints them. */
export function tableText(columns: readonly string[], rows: readonly (readonly Cell[])[]): string {
  const cells = rows.map((row) => row.map((cell) => cell ?? ''))
  const widths = columns.map((column, i) => Math.max(column.length, ...cells.map((row) => row[i]?.length ?? 0)))
  const line = (row: readonly string[]): string =>
    row
      .map((cell, i) => ` ${cell.padEnd(widths[i] ?? 0)} `)
      .join('|')
      .trimEnd()
  return [line(columns), widths.map((width) => '-'.repeat(width + 2)).join('+'), ...cells.map(line)].join('\n')
}

async function rowsOf(client: pg.Client, text: string): Promise<{ readonly columns: readonly string[]; readonly rows: readonly (readonly Cell[])[] }> {
  const result = await client.query<Cell[]>({ text, rowMode: 'array', types: { getTypeParser: () => (value: string) => value } })
  return { columns: result.fields.map((field) => field.name), rows: result.rows }
}

const answer = `SELECT output, mechanism, margin, confidence, coalesce('epsilon ' || trim_scale(epsilon), 'rho ' || trim_scale(rho)) || CASE WHEN delta > 0 THEN ', delta ' || trim_scale(delta) ELSE '' END AS charge
FROM hedgerow.last_answer`
const budget = `SELECT account, trim_scale(epsilon_spent) AS epsilon_spent, epsilon_cap, trim_scale(rho_spent) AS rho_spent, trim_scale(round(rho_cap, 6)) AS rho_cap, default_statements_left
FROM hedgerow.budget`

/** Runs one statement through the wire and says everything about it: the SQL, the answer, margins, noise and charge, the budget after. */
export async function show(client: pg.Client, statement: DemoStatement, number: number, say: (line: string) => void): Promise<boolean> {
  say(`\n── ${number.toString()}. ${statement.point}\n`)
  say(
    statement.sql
      .split('\n')
      .map((line) => `    ${line}`)
      .join('\n'),
  )
  say('')
  try {
    const { columns, rows } = await rowsOf(client, statement.sql)
    say(columns.length > 0 ? tableText(columns, rows) : 'done')
    if (statement.outcome === 'refused') return false
  } catch (problem) {
    if (!(problem instanceof Error)) throw problem
    say(`ERROR:  ${problem.message}`)
    if ('hint' in problem && typeof problem.hint === 'string') say(`HINT:  ${problem.hint}`)
    if (statement.outcome !== 'refused') return false
  }
  if (statement.outcome === 'private answer') {
    const last = await rowsOf(client, answer)
    say('\nnoise and charge (hedgerow.last_answer):')
    say(tableText(last.columns, last.rows))
  }
  const left = await rowsOf(client, budget)
  say('\nbudget after (hedgerow.budget):')
  say(tableText(left.columns, left.rows))
  return true
}
