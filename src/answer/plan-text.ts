import { refuse } from '../base/refusal.ts'
import { planBlock } from '../plan/block.ts'
import type { Limits } from '../plan/limits.ts'
import type { ReleasePlan } from '../plan/release-plan.ts'
import type { DataSet } from '../policy/data-set.ts'
import type { Parser } from '../sql/parser.ts'
import { labelOf } from '../sql/label.ts'
import type { Expr, Query } from '../sql/tree.ts'
import type { Describer } from './block-types.ts'
import { exampleFor } from '../plan/example.ts'

/** A block's text, read and planned with the values it runs with. */
export interface PlannedBlock {
  readonly plan: ReleasePlan
  /** The names of its columns, in order. */
  readonly labels: readonly string[]
  /** The expression of each column as it was written. */
  readonly calls: readonly Expr[]
}

export interface BlockValues {
  readonly args: readonly (string | boolean | null)[]
  readonly now: string
  readonly timeZone: string
}

/**
 * Reads a block's text as anybody may hand it to hedgerow.pull: untrusted. It is read, described and planned exactly as when it was cut out of a statement.
 */
export async function planText(
  text: string,
  values: BlockValues,
  dataSet: DataSet,
  limits: Limits,
  parser: Parser,
  describer: Describer,
): Promise<PlannedBlock> {
  const query = await readBlock(text, dataSet, parser)
  const description = await describer.block(dataSet, text, [])
  if (description.kind === 'complaint')
    return refuse('block.shape', { what: 'a text that PostgreSQL itself complains about', example: exampleFor(dataSet, query) })
  if (description.parameters.length > values.args.length)
    return refuse('block.shape', { what: 'a block with fewer arguments than parameters', example: exampleFor(dataSet, query) })
  const parameters = description.parameters.map((type, i) => ({ type, value: argument(values.args[i]) }))
  const context = { dataSet, parameters, now: values.now, timeZone: values.timeZone, commonTables: new Map(), scans: [] }
  const plan = planBlock(query, context, limits)
  const body = query.body
  return {
    plan,
    labels: body.kind === 'select' ? body.targets.map(labelOf) : [],
    calls: body.kind === 'select' ? body.targets.map((target) => target.value) : [],
  }
}

async function readBlock(text: string, dataSet: DataSet, parser: Parser): Promise<Query> {
  const outcome = await parser.readText(text)
  const example = exampleFor(dataSet, null)
  if (outcome.kind === 'syntax-error') return refuse('block.shape', { what: 'a text that PostgreSQL cannot parse', example })
  const [only, more] = outcome.statements
  if (only === undefined || more !== undefined) return refuse('block.shape', { what: 'more or less than one statement', example })
  if (only.refusal !== null) return refuse(only.refusal.code, { example, ...only.refusal.facts }, only.refusal.at)
  return only.statement.kind === 'query' ? only.statement.query : refuse('block.shape', { what: 'anything but one SELECT', example })
}

function argument(value: string | boolean | null | undefined): string | null {
  return value === null || value === undefined ? null : String(value)
}
