import type { Scalar } from '../catalog/scalar.ts'
import { formOf } from '../catalog/functions/forms.ts'

/** What an expression is on a padding row, where every column of `scans` is NULL. */
export type PaddingValue = 'null' | 'false' | 'zero' | 'unknown'

export function paddingValue(scalar: Scalar, scans: ReadonlySet<number>): PaddingValue {
  const node = scalar.node
  const of = (arg: Scalar | undefined): PaddingValue => (arg === undefined ? 'null' : paddingValue(arg, scans))
  switch (node.kind) {
    case 'column':
      return scans.has(node.scan) ? 'null' : 'unknown'
    case 'parameter':
      return 'unknown'
    case 'constant':
      if (node.text === null) return 'null'
      if (scalar.type.family === 'bool') return node.text === 'false' ? 'false' : 'unknown'
      return scalar.range !== null && scalar.range.low.isZero() && scalar.range.high.isZero() ? 'zero' : 'unknown'
    case 'apply': {
      const args = node.args
      if (formOf(node.form).strict) return args.some((arg) => of(arg) === 'null') ? 'null' : 'unknown'
      switch (node.form) {
        case 'and':
          return args.some((arg) => of(arg) === 'false') ? 'false' : args.some((arg) => of(arg) === 'null') ? 'null' : 'unknown'
        case 'is-not-null':
          return of(args[0]) === 'null' ? 'false' : 'unknown'
        case 'is-boolean':
          return of(args[0]) === 'null' && node.words[1] === '' && node.words[0] !== 'unknown' ? 'false' : 'unknown'
        case 'in':
          return of(args[0]) === 'null' ? 'null' : 'unknown'
        case 'coalesce':
          return args.map(of).find((value) => value !== 'null') ?? 'null'
        case 'case': {
          for (let i = 0; i + 1 < args.length; i += 2) {
            const test = of(args[i])
            if (test === 'unknown' || test === 'zero') return 'unknown'
          }
          return args.length % 2 === 1 ? of(args.at(-1)) : 'null'
        }
        default:
          return 'unknown'
      }
    }
  }
}

/** Whether a test can let a padding row through (NULL and false do not). */
export function keepsPadding(test: Scalar | null, scans: ReadonlySet<number>): boolean {
  if (test === null) return true
  const value = paddingValue(test, scans)
  return value !== 'null' && value !== 'false'
}
