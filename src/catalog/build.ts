import type { Alias, Call, ColumnDefinition, Constant, Expr, FromItem, GroupItem, Query, Select, Target, TypeRef } from '../sql/tree.ts'

/** Small makers of trees that Hedgerow prints itself; positions are -1. */

export function typeRef(schema: string, name: string): TypeRef {
  return { name: [schema, name], modifiers: [], array: [], setof: false }
}

export function constant(value: Constant): Expr {
  return { kind: 'constant', constant: value, at: -1 }
}

export function text(value: string): Expr {
  return constant({ kind: 'string', value })
}

/** A non-negative integer below 2^31 as a constant; any other as a cast text, so that its type never depends on its size. */
export function integer(value: bigint): Expr {
  if (value >= 0n && value < 2147483648n) return constant({ kind: 'integer', value: value.toString() })
  return cast(text(value.toString()), 'int8')
}

/** An exact decimal text as numeric. */
export function numeric(value: string): Expr {
  return cast(text(value), 'numeric')
}

export function nothing(): Expr {
  return constant({ kind: 'null' })
}

export function cast(arg: Expr, name: string, schema = 'pg_catalog'): Expr {
  return { kind: 'cast', arg, type: typeRef(schema, name), at: -1 }
}

export function column(...name: readonly string[]): Expr {
  return { kind: 'column', name, star: false, at: -1 }
}

export function operator(left: Expr | null, name: string, right: Expr): Expr {
  return { kind: 'operator', name: [name], left, right, at: -1 }
}

/** A chain of AND or OR, nested ones taken in, as PostgreSQL's grammar does on sight. */
export function logic(word: 'and' | 'or', args: readonly Expr[]): Expr {
  const flat = args.flatMap((arg) => (arg.kind === 'logic' && arg.word === word ? arg.args : [arg]))
  const [first] = flat
  return flat.length === 1 && first !== undefined ? first : { kind: 'logic', word, args: flat, at: -1 }
}

export function isNull(arg: Expr, negated = false): Expr {
  return { kind: 'is-null', arg, negated, at: -1 }
}

export function when(test: Expr, then: Expr, otherwise: Expr | null): Expr {
  return { kind: 'case', arg: null, whens: [{ when: test, then }], otherwise, at: -1 }
}

export function extreme(word: 'greatest' | 'least', ...args: readonly Expr[]): Expr {
  return { kind: 'extreme', word, args, at: -1 }
}

/** A call of a function of pg_catalog. */
export function call(name: string, args: readonly Expr[], more: Partial<Pick<Call, 'star' | 'distinct' | 'filter' | 'over'>> = {}): Call {
  return {
    kind: 'call',
    name: ['pg_catalog', name],
    args,
    star: more.star ?? false,
    distinct: more.distinct ?? false,
    variadic: false,
    order: [],
    within: false,
    filter: more.filter ?? null,
    over: more.over ?? null,
    syntax: 'plain',
    at: -1,
  }
}

/** A call of one of the lobby's own functions, in its schema `hedgerow`. */
export function hedgerowCall(name: string, args: readonly Expr[]): Call {
  return { ...call(name, args), name: ['hedgerow', name] }
}

/** A value of a SELECT list with its label. */
export function target(value: Expr, label: string): Target {
  return { value, label, at: -1 }
}

/** A query of that body and nothing around it. */
export function bodyQuery(body: Query['body']): Query {
  return { kind: 'query', with: null, body, order: [], limit: null, offset: null, withTies: false }
}

/** A SELECT of what is given; the other clauses are left out. */
export function selectQuery(select: Partial<Select> & Pick<Select, 'targets' | 'from'>): Query {
  return bodyQuery({ kind: 'select', distinct: null, where: null, group: [], groupDistinct: false, having: null, windows: [], ...select })
}

/** GROUP BY 1, 2, … up to `count`. */
export function positions(count: number): readonly GroupItem[] {
  return Array.from({ length: count }, (_, i) => ({ kind: 'expression', value: integer(BigInt(i + 1)) }))
}

/** A query in FROM, under an alias. */
export function subquery(query: Query, alias: string, columns: readonly string[] = []): FromItem {
  return { kind: 'subquery', query, lateral: false, alias: { name: alias, columns }, at: -1 }
}

/** A function in FROM. */
export function functionItem(made: Expr, alias: Alias | null, definitions: readonly ColumnDefinition[] = []): FromItem {
  return { kind: 'function', functions: [{ call: made, definitions: [] }], rowsFrom: false, lateral: false, ordinality: false, alias, definitions, at: -1 }
}
