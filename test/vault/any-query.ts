import { BoundedQuery } from '../../src/bound/bounded-query.ts'

/** A query over any text, for what the vault's side does with errors, limits and odd answers. The compiler closes the constructor; this is the one place that passes it by. */
export function anyQuery(text: string, keyCount: number, totalCount: number): BoundedQuery {
  return Reflect.construct(BoundedQuery, [text, null, keyCount, totalCount]) as BoundedQuery
}
