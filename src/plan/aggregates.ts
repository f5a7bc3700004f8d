import type { Call, Expr } from '../sql/tree.ts'

/** Every aggregate function of PostgreSQL's catalogue: what makes a SELECT an aggregate query. */
export const aggregateNames: ReadonlySet<string> = new Set([
  'count',
  'sum',
  'avg',
  'min',
  'max',
  'bool_and',
  'bool_or',
  'every',
  'bit_and',
  'bit_or',
  'bit_xor',
  'string_agg',
  'array_agg',
  'json_agg',
  'jsonb_agg',
  'json_object_agg',
  'jsonb_object_agg',
  'json_agg_strict',
  'jsonb_agg_strict',
  'json_object_agg_strict',
  'json_object_agg_unique',
  'json_object_agg_unique_strict',
  'jsonb_object_agg_strict',
  'jsonb_object_agg_unique',
  'jsonb_object_agg_unique_strict',
  'xmlagg',
  'range_agg',
  'range_intersect_agg',
  'any_value',
  'var_pop',
  'var_samp',
  'variance',
  'stddev',
  'stddev_pop',
  'stddev_samp',
  'corr',
  'covar_pop',
  'covar_samp',
  'regr_avgx',
  'regr_avgy',
  'regr_count',
  'regr_intercept',
  'regr_r2',
  'regr_slope',
  'regr_sxx',
  'regr_sxy',
  'regr_syy',
  'percentile_cont',
  'percentile_disc',
  'mode',
  'rank',
  'dense_rank',
  'percent_rank',
  'cume_dist',
])

const windowOnly: ReadonlySet<string> = new Set(['rank', 'dense_rank', 'percent_rank', 'cume_dist'])

/** Whether a call aggregates the rows of its own SELECT (a window call does not, and neither does rank() without WITHIN GROUP). */
export function isAggregate(call: Call): boolean {
  const name = call.name.at(-1) ?? ''
  if (call.over !== null || !aggregateNames.has(name)) return false
  if (call.name.length > 1 && call.name[0] !== 'pg_catalog') return false
  return call.within || !windowOnly.has(name)
}

/** Whether an expression is an aggregate call. */
export function asAggregate(expr: Expr): Call | null {
  return expr.kind === 'call' && isAggregate(expr) ? expr : null
}
