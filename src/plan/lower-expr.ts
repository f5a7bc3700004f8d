import { unreachable } from '../base/check.ts'
import { refuse } from '../base/refusal.ts'
import { castTo } from '../catalog/functions/casts.ts'
import { compare, inList, settle } from '../catalog/functions/comparisons.ts'
import { and, choose, coalesce, extreme, isBoolean, isNull, not, nullIf, or, truth } from '../catalog/functions/conditions.ts'
import { like } from '../catalog/functions/texts.ts'
import { parts, type Scalar } from '../catalog/scalar.ts'
import { scalarType } from '../catalog/scalar-type.ts'
import type { Expr } from '../sql/tree.ts'
import type { Context } from './context.ts'
import { aggregateNames } from './aggregates.ts'
import { lowerAny } from './lower-any.ts'
import { lowerCall } from './lower-call.ts'
import { lowerConstant, lowerParameter } from './lower-constant.ts'
import { lowerOperator } from './lower-operator.ts'
import { lowerType } from './lower-type.ts'
import { lowerValueFunction } from './lower-value-function.ts'
import { findColumn, type Scope } from './scope.ts'

/** Reads expressions over the columns of `scope` into scalars that cannot raise, or refuses with the place. */
export function lowerExpr(expr: Expr, scope: Scope, context: Context): Scalar {
  const lower = (each: Expr): Scalar => lowerExpr(each, scope, context)
  switch (expr.kind) {
    case 'column': {
      if (expr.star) refuse('block.shape', { what: '* inside an expression' }, expr.at)
      const found = findColumn(scope, expr.name)
      return found === null ? refuse('block.correlated', { column: expr.name.join('.') }, expr.at) : { ...found, at: expr.at }
    }
    case 'parameter': {
      const parameter = context.parameters[expr.number - 1]
      return parameter === undefined
        ? refuse('expr.unsupported', { what: `parameter $${String(expr.number)}` }, expr.at)
        : lowerParameter(parameter, expr.number, expr.at)
    }
    case 'constant':
      return lowerConstant(expr.constant, expr.at)
    case 'call': {
      const name = expr.name.at(-1) ?? ''
      if (expr.over !== null) refuse('rows.window', { table: tableOf(scope) }, expr.at)
      if (aggregateNames.has(name)) refuse('block.shape', { what: `an aggregate inside this expression` }, expr.at)
      return lowerCall(expr, expr.args.map(lower), context)
    }
    case 'operator':
      return lowerOperator(expr, expr.left === null ? null : lower(expr.left), lower(expr.right))
    case 'logic':
      return expr.word === 'and' ? and(expr.args.map(lower), expr.at) : or(expr.args.map(lower), expr.at)
    case 'not':
      return not(lower(expr.arg), expr.at)
    case 'is-null':
      return isNull(lower(expr.arg), expr.negated, expr.at)
    case 'is-boolean':
      return isBoolean(lower(expr.arg), expr.test, expr.negated, expr.at)
    case 'distinct':
      return compare(expr.negated ? 'not-distinct' : 'distinct', lower(expr.left), lower(expr.right), expr.at)
    case 'in-list':
      return inList(lower(expr.arg), expr.list.map(lower), expr.negated, expr.at)
    case 'between': {
      if (expr.symmetric) refuse('expr.unsupported', { what: 'BETWEEN SYMMETRIC' }, expr.at)
      const arg = lower(expr.arg)
      const inside = and([compare('>=', arg, lower(expr.low), expr.at), compare('<=', arg, lower(expr.high), expr.at)], expr.at)
      return expr.negated ? not(inside, expr.at) : inside
    }
    case 'like':
      if (expr.word === 'similar') refuse('expr.unsupported', { what: 'SIMILAR TO' }, expr.at)
      return like(expr.word, deterministic(lower(expr.arg), context, expr.at), lower(expr.pattern), expr.negated, expr.at)
    case 'quantified':
      return lowerAny(expr, lower, context)
    case 'nullif':
      return nullIf(lower(expr.left), lower(expr.right), expr.at)
    case 'cast': {
      const type = lowerType(expr.type, context.dataSet, expr.at)
      return castTo(lower(expr.arg), type, expr.at)
    }
    case 'case': {
      const arg = expr.arg
      const subject = arg === null ? null : lower(arg)
      const whens = expr.whens.map((each) => ({
        when: subject === null ? truth(lower(each.when)) : compare('=', subject, lower(each.when), expr.at),
        then: lower(each.then),
      }))
      return choose(whens, expr.otherwise === null ? null : lower(expr.otherwise), expr.at)
    }
    case 'coalesce':
      return coalesce(expr.args.map(lower), expr.at)
    case 'extreme':
      return extreme(expr.word, expr.args.map(lower), expr.at)
    case 'value-function':
      return lowerValueFunction(expr.word, context, expr.at)
    case 'sublink':
      return refuse('block.shape', { what: 'a subquery inside a condition' }, expr.at)
    case 'collate':
    case 'row':
    case 'array':
    case 'subscript':
    case 'grouping':
    case 'default':
    case 'named-argument':
      return refuse('expr.unsupported', { what: `this ${expr.kind} expression` }, expr.at)
    default:
      return unreachable(expr)
  }
}

/** PostgreSQL raises where it meets a row whose collation has no patterns. */
function deterministic(scalar: Scalar, context: Context, at: number): Scalar {
  for (const part of parts(scalar)) {
    if (part.node.kind !== 'column') continue
    const { scan, column } = part.node
    if (context.scans.find((each) => each.index === scan)?.table.columns.get(column)?.deterministic === false)
      refuse('expr.unsupported', { what: 'LIKE under a nondeterministic collation' }, at)
  }
  return scalar
}

/** A condition; a bare NULL or string is boolean there. */
export function lowerCondition(expr: Expr, scope: Scope, context: Context): Scalar {
  return truth(settle(lowerExpr(expr, scope, context), scalarType('bool')))
}

function tableOf(scope: Scope): string {
  return scope.items[0]?.name ?? 'a private table'
}
