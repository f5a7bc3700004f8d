import { type ColumnRef, refKey } from './relation.ts'

/** Which columns are equal on every row: classes that only ever merge. */
export interface ColumnClasses {
  /** A name for the class of the column. */
  find(ref: ColumnRef): string
  merge(a: ColumnRef, b: ColumnRef): boolean
  same(a: ColumnRef, b: ColumnRef): boolean
}

export function columnClasses(): ColumnClasses {
  const parent = new Map<string, string>()
  const root = (key: string): string => {
    let at = key
    for (let up = parent.get(at); up !== undefined; up = parent.get(at)) at = up
    return at
  }
  return {
    find: (ref) => root(refKey(ref)),
    merge: (a, b) => {
      const [x, y] = [root(refKey(a)), root(refKey(b))]
      if (x !== y) parent.set(x, y)
      return x !== y
    },
    same: (a, b) => root(refKey(a)) === root(refKey(b)),
  }
}
