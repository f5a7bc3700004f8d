import { BoundedQuery } from '../../src/bound/bounded-query.ts'
import { call, cast, integer, logic, nothing, operator, when } from '../../src/catalog/build.ts'
import type { Scalar } from '../../src/catalog/scalar.ts'
import type { ReleasePlan, Total } from '../../src/plan/release-plan.ts'
import { printQuery } from '../../src/sql/print.ts'
import type { Call, Expr, FromItem, Query, Select } from '../../src/sql/tree.ts'
import { mapExpr } from '../../src/sql/walk.ts'
import { mapQuery } from '../../src/sql/walk-query.ts'
import type { Asked } from './neighbours.ts'

/** A mistake that a planner or printer could make: what it would ask the vault instead, or null where it makes no difference to the block. */
export interface Fault {
  readonly what: string
  /** The kinds of FROM in which it can show; all where there is none. */
  readonly shapes: readonly string[]
  plant(asked: Asked): Asked | null
}

export const faults: readonly Fault[] = [
  {
    what: 'the clamp is missing',
    shapes: [],
    plant: (asked) =>
      reprinted(asked, (plan) =>
        withTotals(plan, (total) => ('units' in total ? { ...total, units: { ...total.units, value: unclamped(total.units.value) } } : total)),
      ),
  },
  {
    what: 'one group more is kept',
    shapes: [],
    plant: (asked) => {
      const { keep } = asked.draw
      if (keep === null) return null
      const query = BoundedQuery.of(asked.plan, asked.fixed, { ...asked.draw, keep: keep + 1n })
      return { ...asked, query }
    },
  },
  {
    what: 'the rows cap is missing',
    shapes: [],
    plant: (asked) =>
      asked.plan.fanOut.single ? null : reprinted(asked, (plan) => withTotals(plan, (total) => ('rows' in total ? { ...total, rows: 1_000_000n } : total))),
  },
  {
    what: 'the bound comes before a join that repeats rows',
    shapes: [],
    plant: (asked) =>
      withTree(
        asked,
        inOuter(asked.query.tree, (select) => ({ ...select, from: [...select.from, repeated] })),
      ),
  },
  {
    what: 'rows are scaled before a join that repeats them',
    shapes: [],
    plant: (asked) =>
      asked.draw.keep === null
        ? withTree(
            asked,
            inBounded(asked.query.tree, (select) => ({ ...select, from: [...select.from, repeated] })),
          )
        : null,
  },
  {
    what: 'rows are cut in no order',
    shapes: ['self × series', 'trips × zones'],
    plant: (asked) => (asked.plan.fanOut.capped.size === 0 ? null : withTree(asked, withoutOrder(asked.query.tree, 'place'))),
  },
  {
    what: 'groups are chosen in no order',
    shapes: [],
    plant: (asked) => (asked.draw.keep === null ? null : withTree(asked, withoutOrder(asked.query.tree, 'pick'))),
  },
  {
    what: 'groups are chosen over all persons',
    shapes: [],
    plant: (asked) =>
      asked.draw.keep === null
        ? null
        : withTree(
            asked,
            inWindows(asked.query.tree, 'pick', (over) => ({ ...over, partition: [] })),
          ),
  },
  {
    what: 'rows of nobody are kept',
    shapes: [],
    plant: (asked) => withTree(asked, withoutPersonTest(asked)),
  },
  {
    what: 'persons are grouped by an expression that can be NULL',
    shapes: [],
    plant: (asked) => (asked.plan.fanOut.single ? null : withTree(asked, halfNull(asked.query.tree))),
  },
]

function reprinted(asked: Asked, change: (plan: ReleasePlan) => ReleasePlan): Asked {
  return { ...asked, query: BoundedQuery.of(change(asked.plan), asked.fixed, asked.draw) }
}

function withTree(asked: Asked, tree: Query): Asked {
  return { ...asked, query: { tree, text: printQuery(tree), keyCount: asked.query.keyCount, totalCount: asked.query.totalCount } }
}

function withTotals(plan: ReleasePlan, change: (total: Total) => Total): ReleasePlan {
  return { ...plan, totals: plan.totals.map(change) }
}

function unclamped(scalar: Scalar): Scalar {
  const { node } = scalar
  if (node.kind === 'apply') return { ...scalar, node: { ...node, args: node.args.map(unclamped) } }
  return node.kind === 'column' ? { ...scalar, node: { ...node, clamped: null } } : scalar
}

const repeated: FromItem = {
  kind: 'function',
  functions: [{ call: call('generate_series', [integer(1n), integer(3n)]), definitions: [] }],
  rowsFrom: false,
  lateral: false,
  ordinality: false,
  alias: { name: 'again', columns: ['n'] },
  definitions: [],
  at: -1,
}

function inOuter(tree: Query, change: (select: Select) => Select): Query {
  return tree.body.kind === 'select' ? { ...tree, body: change(tree.body) } : tree
}

/** Changes the query in which each person's parts are capped. */
function inBounded(tree: Query, change: (select: Select) => Select): Query {
  return inOuter(tree, (select) => ({
    ...select,
    from: select.from.map((item) => (item.kind === 'subquery' ? { ...item, query: inOuter(item.query, change) } : item)),
  }))
}

/** Done to every SELECT, however deep. */
function everywhere(tree: Query, change: (select: Select) => Select): Query {
  const expr = (e: Expr): Expr => mapExpr(e, expr, query)
  const query = (q: Query): Query => inOuter(mapQuery(q, { expr, query }), change)
  return query(tree)
}

function inWindows(tree: Query, label: string, change: (over: NonNullable<Call['over']>) => NonNullable<Call['over']>): Query {
  return everywhere(tree, (select) => ({
    ...select,
    targets: select.targets.map((target) => {
      const value = target.value
      return target.label === label && value.kind === 'call' && value.over !== null ? { ...target, value: { ...value, over: change(value.over) } } : target
    }),
  }))
}

function withoutOrder(tree: Query, label: string): Query {
  return inWindows(tree, label, (over) => ({ ...over, order: [] }))
}

function withoutPersonTest(asked: Asked): Query {
  const name = [`s${asked.plan.owned.person.scan.toString()}`, asked.plan.owned.person.column].join('.')
  const isTest = (e: Expr): boolean => e.kind === 'is-null' && e.negated && e.arg.kind === 'column' && e.arg.name.join('.') === name
  return everywhere(asked.query.tree, (select) => {
    const { where } = select
    if (where === null) return select
    if (isTest(where)) return { ...select, where: null }
    if (where.kind !== 'logic' || where.word !== 'and') return select
    const rest = where.args.filter((arg) => !isTest(arg))
    return { ...select, where: rest.length === 0 ? null : logic('and', rest) }
  })
}

function halfNull(tree: Query): Query {
  return everywhere(tree, (select) => ({
    ...select,
    targets: select.targets.map((target) =>
      target.label === 'p'
        ? {
            ...target,
            value: when(operator(operator(call('hashtext', [cast(target.value, 'text')]), '%', integer(2n)), '=', integer(0n)), nothing(), target.value),
          }
        : target,
    ),
  }))
}
