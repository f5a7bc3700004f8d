import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { sameExpr, sameTree } from '../../src/sql/equal.ts'
import type { Expr, Query } from '../../src/sql/tree.ts'
import { eachQuery, mapQuery, partsOf, queryOf } from '../../src/sql/walk-query.ts'
import { children, eachExpr, mapExpr } from '../../src/sql/walk.ts'
import { anyExpr, anyQuery } from './trees.ts'

const seven: Expr = { kind: 'constant', constant: { kind: 'integer', value: '7' }, at: -1 }

/** Counts the records of plain data that `hit` holds of, without knowing trees. */
function count(value: unknown, hit: (record: Readonly<Record<string, unknown>>) => boolean): number {
  if (typeof value !== 'object' || value === null) return 0
  const inside = Object.values(value).reduce((sum: number, item) => sum + count(item, hit), 0)
  return inside + (!Array.isArray(value) && hit(value as Readonly<Record<string, unknown>>) ? 1 : 0)
}

function rebuild(e: Expr): Expr {
  return mapExpr(e, rebuild, rebuildQuery)
}

function rebuildQuery(q: Query): Query {
  return mapQuery(q, { expr: rebuild, query: rebuildQuery })
}

describe('rebuilding', () => {
  test('with nothing changed gives the same tree, every field of it', () => {
    fc.assert(
      fc.property(anyExpr, (e) => {
        expect(rebuild(e)).toEqual(e)
      }),
    )
    fc.assert(
      fc.property(anyQuery, (q) => {
        expect(rebuildQuery(q)).toEqual(q)
      }),
      { numRuns: 50 },
    )
  })

  test('reaches every constant, at any depth', () => {
    const replace = (e: Expr): Expr => (e.kind === 'constant' ? seven : mapExpr(e, replace, (q) => mapQuery(q, { expr: replace, query: inside })))
    const inside = (q: Query): Query => mapQuery(q, { expr: replace, query: inside })
    fc.assert(
      fc.property(anyQuery, (q) => {
        expect(count(inside(q), (record) => record['kind'] === 'constant' && record['constant'] !== seven.constant)).toBe(0)
      }),
      { numRuns: 50 },
    )
  })
})

describe('visiting', () => {
  test('an expression visits each expression once, and no query', () => {
    const kinds = (e: Expr): number => {
      let found = 0
      eachExpr(e, (inner) => {
        if (inner.kind === 'parameter') found += 1
      })
      return found
    }
    const outside = (e: Expr): Expr =>
      mapExpr(e, outside, () => ({ kind: 'query', with: null, body: { kind: 'values', rows: [] }, order: [], limit: null, offset: null, withTies: false }))
    fc.assert(
      fc.property(anyExpr, (e) => {
        expect(kinds(e)).toBe(count(outside(e), (record) => record['kind'] === 'parameter'))
      }),
    )
  })

  test('a query visits every query in it once', () => {
    fc.assert(
      fc.property(anyQuery, (q) => {
        let found = 0
        eachQuery(q, () => {
          found += 1
        })
        expect(found).toBe(count(q, (record) => record['kind'] === 'query'))
      }),
      { numRuns: 50 },
    )
  })

  test('children come in the order they are written', () => {
    const one: Expr = { kind: 'parameter', number: 1, at: -1 }
    const two: Expr = { kind: 'parameter', number: 2, at: -1 }
    expect(children({ kind: 'operator', name: ['+'], left: one, right: two, at: -1 })).toEqual([one, two])
    expect(children({ kind: 'case', arg: null, whens: [{ when: one, then: two }], otherwise: seven, at: -1 })).toEqual([one, two, seven])
    expect(children(seven)).toEqual([])
  })

  test('a statement inside a statement lends its query', () => {
    const query: Query = { kind: 'query', with: null, body: { kind: 'values', rows: [[seven]] }, order: [], limit: null, offset: null, withTies: false }
    expect(queryOf({ kind: 'explain', options: [], statement: { kind: 'prepare', name: 'p', types: [], statement: { kind: 'query', query } } })).toBe(query)
    expect(queryOf({ kind: 'other', tag: 'LockStmt' })).toBeNull()
    expect(partsOf(query)).toEqual({ exprs: [seven], queries: [] })
  })
})

describe('sameness', () => {
  test('does not look at places', () => {
    const moved = (value: unknown): unknown => {
      if (Array.isArray(value)) return value.map(moved)
      if (typeof value !== 'object' || value === null) return value
      return Object.fromEntries(Object.entries(value).map(([name, item]) => [name, name === 'at' ? 99 : moved(item)]))
    }
    fc.assert(
      fc.property(anyExpr, (e) => {
        expect(sameExpr(e, moved(e) as Expr)).toBe(true)
      }),
    )
    fc.assert(
      fc.property(anyQuery, (q) => {
        expect(sameTree(q, moved(q) as Query)).toBe(true)
      }),
      { numRuns: 50 },
    )
  })

  test('looks at everything else', () => {
    const changed = (e: Expr): Expr => (e.kind === 'constant' ? { kind: 'parameter', number: 99, at: -1 } : mapExpr(e, changed))
    fc.assert(
      fc.property(anyExpr, (e) => {
        let constants = 0
        eachExpr(e, (inner) => {
          if (inner.kind === 'constant') constants += 1
        })
        expect(sameExpr(e, changed(e))).toBe(constants === 0 || JSON.stringify(changed(e)) === JSON.stringify(e))
      }),
    )
    expect(sameExpr(seven, { ...seven, constant: { kind: 'decimal', value: '7' } })).toBe(false)
    expect(sameExpr({ kind: 'row', args: [], explicit: true, at: -1 }, { kind: 'row', args: [seven], explicit: true, at: -1 })).toBe(false)
  })
})
