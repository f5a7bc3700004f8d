import fc from 'fast-check'
import type { Alias, Expr, FromItem, GroupItem, Query, SortItem, Target, TypeRef, Window } from '../../src/sql/tree.ts'
import { constant, name, operator, word } from './tree-words.ts'

/** Generated trees of every kind that a text can hold: none that the parser would fold or flatten into another. */

const at = -1

/** Operators that the grammar knows between two operands only. */
const infixOnly: ReadonlySet<string> = new Set(['*', '/', '%', '^', '=', '<>', '<', '>', '<=', '>='])

function maybe<T>(arbitrary: fc.Arbitrary<T>): fc.Arbitrary<T | null> {
  return fc.option(arbitrary, { nil: null, freq: 2 })
}

function some<T>(arbitrary: fc.Arbitrary<T>, minLength = 1, maxLength = 3): fc.Arbitrary<readonly T[]> {
  return fc.array(arbitrary, { minLength, maxLength })
}

function isScalar(e: Expr): boolean {
  return e.kind === 'sublink' && e.link === 'scalar'
}

function isNumber(e: Expr): boolean {
  return e.kind === 'constant' && (e.constant.kind === 'integer' || e.constant.kind === 'decimal')
}

/** `- 1` is one constant to the parser: its negative is the positive one again. */
function isNegative(e: Expr): boolean {
  return e.kind === 'operator' && e.left === null && e.name.length === 1 && e.name[0] === '-' && isNumber(e.right)
}

const units = { rows: 0x4, range: 0x2, groups: 0x8 } as const

const { expr, query } = fc.letrec<{
  expr: Expr
  leaf: Expr
  query: Query
  body: Query['body']
  from: FromItem
  window: Window
  sort: SortItem
  type: TypeRef
  group: GroupItem
}>((tie) => {
  const e = tie('expr')
  const exprs = some(e)
  const q = tie('query')
  const sorts = fc.array(tie('sort'), { maxLength: 2 })
  const alias: fc.Arbitrary<Alias> = fc.record({ name: word, columns: fc.array(word, { maxLength: 2 }) })

  const leaf: fc.Arbitrary<Expr> = fc.oneof(
    fc.record({ kind: fc.constant('column' as const), name, star: fc.constant(false), at: fc.constant(at) }),
    constant.map((value) => ({ kind: 'constant', constant: value, at }) as const),
    fc.integer({ min: 1, max: 9 }).map((number) => ({ kind: 'parameter', number, at }) as const),
    fc
      .constantFrom('current_date', 'localtime', 'user', 'current_schema')
      .map((value) => ({ kind: 'value-function', word: value, precision: -1, at }) as const),
  )

  const call: fc.Arbitrary<Expr> = fc.oneof(
    fc
      .record({
        kind: fc.constant('call' as const),
        name,
        args: exprs,
        star: fc.constant(false),
        distinct: fc.boolean(),
        variadic: fc.boolean(),
        order: sorts,
        within: fc.constant(false),
        filter: maybe(e),
        over: maybe(tie('window')),
        syntax: fc.constant('plain' as const),
        at: fc.constant(at),
      })
      .map((c) => (c.variadic ? { ...c, distinct: false } : c)),
    fc.record({
      kind: fc.constant('call' as const),
      name,
      args: fc.array(e, { maxLength: 2 }),
      star: fc.constant(false),
      distinct: fc.constant(false),
      variadic: fc.constant(false),
      order: some(tie('sort'), 1, 2),
      within: fc.constant(true),
      filter: maybe(e),
      over: fc.constant(null),
      syntax: fc.constant('plain' as const),
      at: fc.constant(at),
    }),
    fc
      .constantFrom(
        ['extract', 2],
        ['timezone', 1],
        ['timezone', 2],
        ['substring', 2],
        ['substring', 3],
        ['position', 2],
        ['overlay', 3],
        ['overlay', 4],
        ['btrim', 1],
        ['ltrim', 2],
        ['rtrim', 3],
        ['overlaps', 4],
        ['is_normalized', 1],
        ['normalize', 1],
        ['pg_collation_for', 1],
        ['system_user', 0],
      )
      .chain(([which, count]) =>
        fc.array(e, { minLength: count as number, maxLength: count as number }).map((args) => ({
          kind: 'call' as const,
          name: ['pg_catalog', which as string],
          args: which === 'extract' ? [{ kind: 'constant' as const, constant: { kind: 'string' as const, value: 'year' }, at }, ...args.slice(1)] : args,
          star: false,
          distinct: false,
          variadic: false,
          order: [],
          within: false,
          filter: null,
          over: null,
          syntax: 'sql' as const,
          at,
        })),
      ),
  )

  const compound: fc.Arbitrary<Expr> = fc.oneof(
    call,
    fc
      .record({ kind: fc.constant('operator' as const), name: operator, left: maybe(e), right: e, at: fc.constant(at) })
      .map((o) => (o.left === null && (isNegative(o.right) || (o.name.length === 1 && infixOnly.has(o.name[0] ?? ''))) ? { ...o, left: o.right } : o)),
    fc
      .record({ kind: fc.constant('logic' as const), word: fc.constantFrom('and' as const, 'or' as const), args: some(e, 2, 3), at: fc.constant(at) })
      .filter((l) => l.args[0]?.kind !== 'logic' || l.args[0].word !== l.word),
    fc.record({ kind: fc.constant('not' as const), arg: e, at: fc.constant(at) }),
    fc.record({ kind: fc.constant('is-null' as const), arg: e, negated: fc.boolean(), at: fc.constant(at) }),
    fc.record({
      kind: fc.constant('is-boolean' as const),
      arg: e,
      test: fc.constantFrom('true' as const, 'false' as const, 'unknown' as const),
      negated: fc.boolean(),
      at: fc.constant(at),
    }),
    fc.record({ kind: fc.constant('distinct' as const), name: fc.constant(['=']), left: e, right: e, negated: fc.boolean(), at: fc.constant(at) }),
    fc
      .record({ kind: fc.constant('in-list' as const), arg: e, list: exprs, negated: fc.boolean(), at: fc.constant(at) })
      .filter((i) => i.list.length > 1 || !i.list.some(isScalar)),
    fc.record({ kind: fc.constant('between' as const), arg: e, low: e, high: e, negated: fc.boolean(), symmetric: fc.boolean(), at: fc.constant(at) }),
    fc
      .record({
        kind: fc.constant('like' as const),
        arg: e,
        pattern: e,
        word: fc.constantFrom('like' as const, 'ilike' as const),
        operator: fc.constant(['~~']),
        negated: fc.boolean(),
        at: fc.constant(at),
      })
      .map((l) => ({ ...l, operator: [`${l.negated ? '!' : ''}~~${l.word === 'ilike' ? '*' : ''}`] })),
    fc
      .record({ kind: fc.constant('quantified' as const), left: e, name: operator, all: fc.boolean(), right: e, at: fc.constant(at) })
      .filter((x) => !isScalar(x.right)),
    fc.record({ kind: fc.constant('nullif' as const), name: fc.constant(['=']), left: e, right: e, at: fc.constant(at) }),
    fc.record({ kind: fc.constant('cast' as const), arg: e, type: tie('type'), at: fc.constant(at) }),
    fc.record({ kind: fc.constant('case' as const), arg: maybe(e), whens: some(fc.record({ when: e, then: e })), otherwise: maybe(e), at: fc.constant(at) }),
    fc.record({ kind: fc.constant('coalesce' as const), args: exprs, at: fc.constant(at) }),
    fc.record({ kind: fc.constant('extreme' as const), word: fc.constantFrom('greatest' as const, 'least' as const), args: exprs, at: fc.constant(at) }),
    fc
      .record({ kind: fc.constant('row' as const), args: fc.array(e, { maxLength: 3 }), explicit: fc.boolean(), at: fc.constant(at) })
      .map((r) => (r.args.length < 2 ? { ...r, explicit: true } : r)),
    fc.record({ kind: fc.constant('array' as const), items: fc.array(e, { maxLength: 3 }), at: fc.constant(at) }),
    fc.record({
      kind: fc.constant('subscript' as const),
      arg: e,
      steps: some(
        fc.oneof(
          fc.record({ kind: fc.constant('index' as const), index: e }),
          fc.record({ kind: fc.constant('slice' as const), low: maybe(e), high: maybe(e) }),
          fc.record({ kind: fc.constant('field' as const), name: word }),
        ),
        1,
        2,
      ),
      at: fc.constant(at),
    }),
    fc.record({ kind: fc.constant('collate' as const), arg: e, collation: name, at: fc.constant(at) }),
    fc.record({ kind: fc.constant('grouping' as const), args: exprs, at: fc.constant(at) }),
    fc.record({
      kind: fc.constant('sublink' as const),
      link: fc.constantFrom('exists' as const, 'scalar' as const, 'array' as const),
      test: fc.constant(null),
      operator: fc.constant([]),
      query: q,
      at: fc.constant(at),
    }),
    fc.record({
      kind: fc.constant('sublink' as const),
      link: fc.constantFrom('any' as const, 'all' as const),
      test: e,
      operator,
      query: q,
      at: fc.constant(at),
    }),
    fc.record({ kind: fc.constant('sublink' as const), link: fc.constant('any' as const), test: e, operator: fc.constant([]), query: q, at: fc.constant(at) }),
  )

  const target: fc.Arbitrary<Target> = fc
    .record({
      value: fc.oneof(e, fc.constant({ kind: 'column', name: [], star: true, at } as const)),
      label: fc.oneof(fc.constant(''), word),
      at: fc.constant(at),
    })
    .map((t) => (t.value.kind === 'column' && t.value.star ? { ...t, label: '' } : t))

  const from: fc.Arbitrary<FromItem> = fc.oneof(
    { maxDepth: 3, depthIdentifier: 'tree' },
    fc.record({ kind: fc.constant('table' as const), name, only: fc.boolean(), alias: maybe(alias), at: fc.constant(at) }),
    fc.record({ kind: fc.constant('subquery' as const), query: q, lateral: fc.boolean(), alias: maybe(alias), at: fc.constant(at) }),
    fc.record({
      kind: fc.constant('join' as const),
      type: fc.constantFrom('inner' as const, 'left' as const, 'right' as const, 'full' as const),
      natural: fc.constant(false),
      left: tie('from'),
      right: tie('from'),
      using: fc.constant([]),
      usingAlias: fc.constant(null),
      on: e,
      alias: maybe(alias),
      at: fc.constant(at),
    }),
    fc.record({
      kind: fc.constant('join' as const),
      type: fc.constant('inner' as const),
      natural: fc.boolean(),
      left: tie('from'),
      right: tie('from'),
      using: fc.constant([]),
      usingAlias: fc.constant(null),
      on: fc.constant(null),
      alias: maybe(alias),
      at: fc.constant(at),
    }),
    fc.record({
      kind: fc.constant('join' as const),
      type: fc.constantFrom('left' as const, 'full' as const),
      natural: fc.constant(false),
      left: tie('from'),
      right: tie('from'),
      using: some(word),
      usingAlias: maybe(fc.record({ name: word, columns: fc.constant([]) })),
      on: fc.constant(null),
      alias: fc.constant(null),
      at: fc.constant(at),
    }),
  )

  const select: fc.Arbitrary<Query['body']> = fc
    .record({
      kind: fc.constant('select' as const),
      distinct: fc.oneof(fc.constant(null), fc.constant([]), exprs),
      targets: some(target),
      from: fc.array(tie('from'), { maxLength: 2 }),
      where: maybe(e),
      group: fc.array(tie('group'), { maxLength: 2 }),
      groupDistinct: fc.boolean(),
      having: maybe(e),
      windows: fc.array(
        fc.tuple(tie('window'), word).map(([w, n]) => ({ ...w, name: n })),
        { maxLength: 1 },
      ),
    })
    .map((s) => (s.group.length === 0 ? { ...s, groupDistinct: false } : s))

  return {
    leaf,
    expr: fc.oneof({ maxDepth: 3, depthIdentifier: 'tree' }, leaf, compound),
    type: fc.record({
      name,
      modifiers: fc.array(
        constant.map((value) => ({ kind: 'constant', constant: value, at }) as const),
        { maxLength: 2 },
      ),
      array: fc.array(fc.constantFrom(-1, 0, 3), { maxLength: 2 }),
      setof: fc.constant(false),
    }),
    sort: fc
      .record({
        by: e,
        direction: fc.constantFrom('default' as const, 'asc' as const, 'desc' as const, 'using' as const),
        using: operator,
        nulls: fc.constantFrom('default' as const, 'first' as const, 'last' as const),
      })
      .map((s) => (s.direction === 'using' ? s : { ...s, using: [] })),
    window: fc.record({
      name: fc.constant(''),
      refers: fc.oneof(fc.constant(''), word),
      partition: fc.array(e, { maxLength: 2 }),
      order: sorts,
      frame: fc.oneof(
        fc.constant({ options: 0x422, start: null, end: null }),
        fc.tuple(fc.constantFrom(...Object.values(units)), e, e).map(([unit, start, end]) => ({ options: 0x11 | unit | 0x800 | 0x4000, start, end })),
        fc
          .tuple(fc.constantFrom(...Object.values(units)), fc.constantFrom(0, 0x8000, 0x10000, 0x20000))
          .map(([unit, exclude]) => ({ options: 0x1 | unit | 0x200 | 0x400 | exclude, start: null, end: null })),
      ),
    }),
    group: fc.oneof(
      { maxDepth: 3, depthIdentifier: 'tree' },
      e.map((value) => ({ kind: 'expression', value }) as const),
      fc.constant({ kind: 'empty', at } as const),
      fc.record({ kind: fc.constant('sets' as const), word: fc.constant('grouping sets' as const), items: some(tie('group')), at: fc.constant(at) }),
      fc.record({
        kind: fc.constant('sets' as const),
        word: fc.constantFrom('rollup' as const, 'cube' as const),
        items: some(e.map((value) => ({ kind: 'expression', value }) as const)),
        at: fc.constant(at),
      }),
    ),
    from,
    body: fc.oneof(
      { maxDepth: 3, depthIdentifier: 'tree' },
      select,
      fc
        .integer({ min: 1, max: 2 })
        .chain((width) => some(fc.array(e, { minLength: width, maxLength: width })))
        .map((rows) => ({ kind: 'values', rows }) as const),
      fc.record({
        kind: fc.constant('set-operation' as const),
        word: fc.constantFrom('union' as const, 'intersect' as const, 'except' as const),
        all: fc.boolean(),
        left: q,
        right: q,
      }),
    ),
    query: fc
      .record({
        kind: fc.constant('query' as const),
        with: maybe(
          fc.record({
            recursive: fc.boolean(),
            tables: some(
              fc.record({
                name: word,
                columns: fc.array(word, { maxLength: 2 }),
                materialized: fc.constantFrom('default' as const, 'always' as const, 'never' as const),
                query: q,
                at: fc.constant(at),
              }),
              1,
              2,
            ),
          }),
        ),
        body: tie('body'),
        order: sorts,
        limit: maybe(e),
        offset: maybe(e),
        withTies: fc.boolean(),
      })
      .map((x) => (x.limit === null || x.order.length === 0 ? { ...x, withTies: false } : x)),
  }
})

/** Any expression that can stand as a target. */
export const anyExpr: fc.Arbitrary<Expr> = expr
/** Any query. */
export const anyQuery: fc.Arbitrary<Query> = query
