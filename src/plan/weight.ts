import type { Scalar } from '../catalog/scalar.ts'

/** Characters that a text column is taken to have: what is made of it can grow from there. */
const columnLength = 200
/** Beyond this every form cuts its arguments. */
const longest = 20_000

interface Weighed {
  readonly weight: number
  /** Characters of a text, at the most. */
  readonly length: number
}

/**
 * The work that expressions are on each row, in microseconds or so: a step for each operation, and for texts and long numbers by their length. Whoever has rows
 * pays it and whoever has none does not, so it decides the time class, and beyond a ceiling the statement is refused.
 */
export function weightOf(scalars: Iterable<Scalar>): number {
  let sum = 0
  for (const scalar of scalars) sum += weigh(scalar).weight
  return sum
}

function weigh(scalar: Scalar): Weighed {
  const { node } = scalar
  switch (node.kind) {
    case 'column':
      return { weight: node.clamped === null ? 0 : 1, length: columnLength }
    case 'constant':
      return { weight: 0, length: node.text?.length ?? 0 }
    case 'parameter':
      return { weight: 0, length: columnLength }
    case 'apply': {
      const args = node.args.map(weigh)
      const below = args.reduce((sum, arg) => sum + arg.weight, 0)
      const texts = node.args.map((arg, i) => (arg.type.family === 'text' ? (args[i]?.length ?? 0) : 0))
      const length = node.form === 'concat' ? texts.reduce((a, b) => a + b, 0) : Math.max(0, ...texts)
      return { weight: below + 1 + Math.min(length, longest) / 100 + digits(scalar) / 100, length: Math.min(length, longest) }
    }
  }
}

/** Decimal digits of a number that is computed in numeric. */
function digits(scalar: Scalar): number {
  if (scalar.carrier !== 'numeric' || scalar.range === null) return 0
  return Math.max(
    ...[scalar.range.low, scalar.range.high, scalar.range.step].map((end) => (end === null ? 0 : end.n.toString().length + end.d.toString().length)),
  )
}
