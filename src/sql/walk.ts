import { unreachable } from '../base/check.ts'
import type { Expr, Query, SortItem, Subscript, TypeRef, Window } from './tree.ts'

type Of<K extends Expr['kind']> = Extract<Expr, { readonly kind: K }>

/** Rebuilds an expression with `f` done to each of its direct children, in the order they are written. The query of a sublink stays, unless `query` is given. */
export function mapExpr(e: Expr, f: (child: Expr) => Expr, query?: (q: Query) => Query): Expr {
  const all = (list: readonly Expr[]): readonly Expr[] => list.map(f)
  const maybe = (child: Expr | null): Expr | null => child && f(child)
  switch (e.kind) {
    case 'column':
    case 'parameter':
    case 'constant':
    case 'value-function':
    case 'default':
      return e
    case 'call':
      return {
        kind: 'call',
        name: e.name,
        args: all(e.args),
        star: e.star,
        distinct: e.distinct,
        variadic: e.variadic,
        order: mapOrder(e.order, f),
        within: e.within,
        filter: maybe(e.filter),
        over: e.over && mapWindow(e.over, f),
        syntax: e.syntax,
        at: e.at,
      } satisfies Of<'call'>
    case 'named-argument':
      return { kind: 'named-argument', name: e.name, value: f(e.value), at: e.at } satisfies Of<'named-argument'>
    case 'operator':
      return { kind: 'operator', name: e.name, left: maybe(e.left), right: f(e.right), at: e.at } satisfies Of<'operator'>
    case 'logic':
      return { kind: 'logic', word: e.word, args: all(e.args), at: e.at } satisfies Of<'logic'>
    case 'not':
      return { kind: 'not', arg: f(e.arg), at: e.at } satisfies Of<'not'>
    case 'is-null':
      return { kind: 'is-null', arg: f(e.arg), negated: e.negated, at: e.at } satisfies Of<'is-null'>
    case 'is-boolean':
      return { kind: 'is-boolean', arg: f(e.arg), test: e.test, negated: e.negated, at: e.at } satisfies Of<'is-boolean'>
    case 'distinct':
      return { kind: 'distinct', name: e.name, left: f(e.left), right: f(e.right), negated: e.negated, at: e.at } satisfies Of<'distinct'>
    case 'in-list':
      return { kind: 'in-list', arg: f(e.arg), list: all(e.list), negated: e.negated, at: e.at } satisfies Of<'in-list'>
    case 'between':
      return {
        kind: 'between',
        arg: f(e.arg),
        low: f(e.low),
        high: f(e.high),
        negated: e.negated,
        symmetric: e.symmetric,
        at: e.at,
      } satisfies Of<'between'>
    case 'like':
      return {
        kind: 'like',
        arg: f(e.arg),
        pattern: f(e.pattern),
        word: e.word,
        operator: e.operator,
        negated: e.negated,
        at: e.at,
      } satisfies Of<'like'>
    case 'quantified':
      return { kind: 'quantified', left: f(e.left), name: e.name, all: e.all, right: f(e.right), at: e.at } satisfies Of<'quantified'>
    case 'nullif':
      return { kind: 'nullif', name: e.name, left: f(e.left), right: f(e.right), at: e.at } satisfies Of<'nullif'>
    case 'cast':
      return { kind: 'cast', arg: f(e.arg), type: mapType(e.type, f), at: e.at } satisfies Of<'cast'>
    case 'case':
      return {
        kind: 'case',
        arg: maybe(e.arg),
        whens: e.whens.map((item) => ({ when: f(item.when), then: f(item.then) })),
        otherwise: maybe(e.otherwise),
        at: e.at,
      } satisfies Of<'case'>
    case 'coalesce':
      return { kind: 'coalesce', args: all(e.args), at: e.at } satisfies Of<'coalesce'>
    case 'extreme':
      return { kind: 'extreme', word: e.word, args: all(e.args), at: e.at } satisfies Of<'extreme'>
    case 'row':
      return { kind: 'row', args: all(e.args), explicit: e.explicit, at: e.at } satisfies Of<'row'>
    case 'array':
      return { kind: 'array', items: all(e.items), at: e.at } satisfies Of<'array'>
    case 'subscript':
      return { kind: 'subscript', arg: f(e.arg), steps: e.steps.map((step) => mapStep(step, f)), at: e.at } satisfies Of<'subscript'>
    case 'collate':
      return { kind: 'collate', arg: f(e.arg), collation: e.collation, at: e.at } satisfies Of<'collate'>
    case 'grouping':
      return { kind: 'grouping', args: all(e.args), at: e.at } satisfies Of<'grouping'>
    case 'sublink':
      return {
        kind: 'sublink',
        link: e.link,
        test: maybe(e.test),
        operator: e.operator,
        query: query === undefined ? e.query : query(e.query),
        at: e.at,
      } satisfies Of<'sublink'>
    default:
      return unreachable(e)
  }
}

function mapStep(step: Subscript, f: (child: Expr) => Expr): Subscript {
  switch (step.kind) {
    case 'index':
      return { kind: 'index', index: f(step.index) }
    case 'slice':
      return { kind: 'slice', low: step.low && f(step.low), high: step.high && f(step.high) }
    case 'field':
    case 'all-fields':
      return step
    default:
      return unreachable(step)
  }
}

/** Rebuilds a type with `f` done to each of its modifiers. */
export function mapType(type: TypeRef, f: (child: Expr) => Expr): TypeRef {
  return { name: type.name, modifiers: type.modifiers.map(f), array: type.array, setof: type.setof } satisfies TypeRef
}

/** Rebuilds an ORDER BY list with `f` done to what it sorts by. */
export function mapOrder(order: readonly SortItem[], f: (child: Expr) => Expr): readonly SortItem[] {
  return order.map((item) => ({ by: f(item.by), direction: item.direction, using: item.using, nulls: item.nulls }) satisfies SortItem)
}

/** Rebuilds a window with `f` done to each expression in it. */
export function mapWindow(window: Window, f: (child: Expr) => Expr): Window {
  return {
    name: window.name,
    refers: window.refers,
    partition: window.partition.map(f),
    order: mapOrder(window.order, f),
    frame: { options: window.frame.options, start: window.frame.start && f(window.frame.start), end: window.frame.end && f(window.frame.end) },
  } satisfies Window
}

/** The direct children of an expression, in the order they are written; of a sublink its test, but nothing of its query. */
export function children(e: Expr): readonly Expr[] {
  const found: Expr[] = []
  mapExpr(e, (child) => {
    found.push(child)
    return child
  })
  return found
}

/** Visits an expression and all beneath it, parents first; the queries of sublinks are not entered. */
export function eachExpr(e: Expr, visit: (e: Expr) => void): void {
  visit(e)
  for (const child of children(e)) eachExpr(child, visit)
}
