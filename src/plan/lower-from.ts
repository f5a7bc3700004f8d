import { unreachable } from '../base/check.ts'
import { refuse } from '../base/refusal.ts'
import { compare } from '../catalog/functions/comparisons.ts'
import type { Scalar } from '../catalog/scalar.ts'
import type { Alias, FromItem, Query } from '../sql/tree.ts'
import type { Context } from './context.ts'
import { lowerColumn } from './lower-column.ts'
import { lowerCondition } from './lower-expr.ts'
import { lowerListed } from './lower-listed.ts'
import { lowerRows } from './lower-rows.ts'
import { findTable } from './names.ts'
import { conjuncts, type Scan, type Source } from './relation.ts'
import { besides, padded, type Scope, type VisibleColumn } from './scope.ts'

export interface Lowered {
  readonly source: Source
  readonly scope: Scope
}

/** A FROM list: its items side by side. */
export function lowerFromList(items: readonly FromItem[], context: Context): Lowered {
  const [first, ...rest] = items.map((item) => lowerFrom(item, context))
  if (first === undefined) return refuse('block.shape', { what: 'an aggregate without FROM' })
  return rest.reduce(
    (left, right) => ({
      source: { kind: 'join', type: 'inner', left: left.source, right: right.source, on: [], at: -1 },
      scope: besides(left.scope, right.scope),
    }),
    first,
  )
}

function lowerFrom(item: FromItem, context: Context): Lowered {
  switch (item.kind) {
    case 'table':
      return lowerTable(item, context)
    case 'subquery':
      if (item.lateral) refuse('block.shape', { what: 'LATERAL' }, item.at)
      return lowerDerived(item.query, item.alias, context, item.at)
    case 'function':
      return lowerListed(item, context)
    case 'join':
      return lowerJoin(item, context)
    default:
      return unreachable(item)
  }
}

function lowerTable(item: Extract<FromItem, { kind: 'table' }>, context: Context): Lowered {
  const bare = item.name.at(-1) ?? ''
  const common = item.name.length === 1 ? context.commonTables.get(bare) : undefined
  if (common !== undefined)
    return lowerDerived(common.query, item.alias ?? { name: bare, columns: [] }, { ...context, commonTables: common.sees }, item.at, common.columns)
  const table = findTable(context.dataSet, item.name)
  if (table === null) return refuse('block.mixed', { what: `"${item.name.join('.')}"` }, item.at)
  const scan: Scan = { index: context.scans.length, table, at: item.at }
  context.scans.push(scan)
  const columns = [...table.columns.values()].map((column, i): VisibleColumn => ({
    name: item.alias?.columns[i] ?? column.name,
    scalar: lowerColumn(scan.index, column, item.at),
  }))
  const scope: Scope = { items: [{ name: item.alias?.name ?? table.name, schema: item.alias === null ? table.schema : '', columns }], star: columns }
  return { source: { kind: 'scan', scan }, scope }
}

function lowerDerived(query: Query, alias: Alias | null, context: Context, at: number, columnNames: readonly string[] = []): Lowered {
  const rows = lowerRows(query, context, at)
  const columns = rows.columns.map((column, i): VisibleColumn => ({ name: alias?.columns[i] ?? columnNames[i] ?? column.name, scalar: column.scalar }))
  return { source: rows.source, scope: { items: [{ name: alias?.name ?? '', schema: '', columns }], star: columns } }
}

function lowerJoin(item: Extract<FromItem, { kind: 'join' }>, context: Context): Lowered {
  if (item.type === 'full') refuse('join.outer', { what: 'FULL JOIN' }, item.at)
  if (item.usingAlias !== null) refuse('block.shape', { what: 'an alias for USING' }, item.at)
  const [first, second] = [lowerFrom(item.left, context), lowerFrom(item.right, context)]
  const left = item.type === 'right' ? { ...first, scope: padded(first.scope, item.at) } : first
  const right = item.type === 'left' ? { ...second, scope: padded(second.scope, item.at) } : second
  const names = item.natural
    ? first.scope.star.map((column) => column.name).filter((name) => second.scope.star.some((other) => other.name === name))
    : item.using
  const merged = merge(names, left.scope, right.scope, item.type === 'right', item.at)
  const both = besides(first.scope, second.scope)
  const on = [...merged.tests, ...(item.on === null ? [] : conjuncts(lowerCondition(item.on, both, context)))]
  const scope: Scope = named(item.alias, { items: [...left.scope.items, ...right.scope.items], star: merged.star })
  const type = item.type === 'inner' ? 'inner' : 'left'
  const [outer, inner] = item.type === 'right' ? [right.source, left.source] : [left.source, right.source]
  return { source: { kind: 'join', type, left: outer, right: inner, on, at: item.at }, scope }
}

function named(alias: Alias | null, scope: Scope): Scope {
  if (alias === null) return scope
  const columns = scope.star.map((column, i) => ({ name: alias.columns[i] ?? column.name, scalar: column.scalar }))
  return { items: [{ name: alias.name, schema: '', columns }], star: columns }
}

/** USING and NATURAL: the shared columns come once, first, from the side that is never padded. */
function merge(
  names: readonly string[],
  left: Scope,
  right: Scope,
  fromRight: boolean,
  at: number,
): { readonly tests: readonly Scalar[]; readonly star: readonly VisibleColumn[] } {
  const pick = (scope: Scope, name: string): VisibleColumn =>
    scope.star.find((column) => column.name === name) ?? refuse('block.shape', { what: `USING (${name}), which one side lacks,` }, at)
  const tests = names.map((name) => compare('=', pick(left, name).scalar, pick(right, name).scalar, at))
  const shared = names.map((name) => pick(fromRight ? right : left, name))
  const others = [...left.star, ...right.star].filter((column) => !names.includes(column.name))
  return { tests, star: [...shared, ...others] }
}
