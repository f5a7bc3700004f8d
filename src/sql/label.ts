import { unreachable } from '../base/check.ts'
import type { Expr, Query, Target } from './tree.ts'

/**
 * The column name PostgreSQL gives a target, after its FigureColname (src/backend/parser/parse_target.c). A target with a star has no name of its own:
 * '' for `*` and `t.*`, and for a scalar subquery whose first target is one.
 */
export function labelOf(target: Target): string {
  if (target.label !== '') return target.label
  if (isStar(target.value)) return ''
  const found = figure(target.value)
  return found.name === null ? unnamed : found.name
}

const unnamed = '?column?'

interface Figure {
  readonly name: string | null
  /** A weak name gives way to a type's: those of types themselves and of CASE. */
  readonly weak: boolean
}

const none: Figure = { name: null, weak: true }

function strong(name: string): Figure {
  return { name, weak: false }
}

function figure(e: Expr): Figure {
  switch (e.kind) {
    case 'column':
      return strong(e.name.at(-1) ?? '')
    case 'call':
      return strong(e.name.at(-1) ?? '')
    case 'subscript': {
      const field = e.steps.findLast((step) => step.kind === 'field')
      return field === undefined ? figure(e.arg) : strong(field.name)
    }
    case 'nullif':
    case 'coalesce':
    case 'grouping':
    case 'array':
    case 'row':
      return strong(e.kind)
    case 'extreme':
    case 'value-function':
      return strong(e.word)
    case 'cast': {
      const inner = figure(e.arg)
      return inner.weak ? { name: e.type.name.at(-1) ?? '', weak: true } : inner
    }
    case 'collate':
      return figure(e.arg)
    case 'case': {
      const inner = e.otherwise === null ? none : figure(e.otherwise)
      return inner.weak ? { name: 'case', weak: true } : inner
    }
    case 'sublink':
      return sublinkFigure(e.link, e.query)
    case 'parameter':
    case 'constant':
    case 'named-argument':
    case 'operator':
    case 'logic':
    case 'not':
    case 'is-null':
    case 'is-boolean':
    case 'distinct':
    case 'in-list':
    case 'between':
    case 'like':
    case 'quantified':
    case 'default':
      return none
    default:
      return unreachable(e)
  }
}

function sublinkFigure(link: Extract<Expr, { readonly kind: 'sublink' }>['link'], query: Query): Figure {
  switch (link) {
    case 'exists':
      return strong('exists')
    case 'array':
      return strong('array')
    case 'scalar':
      return strong(firstLabel(query))
    case 'any':
    case 'all':
      return none
    default:
      return unreachable(link)
  }
}

/** A scalar subquery is named after its column, were it '?column?'. */
function firstLabel(query: Query): string {
  const body = query.body
  switch (body.kind) {
    case 'select':
      return body.targets[0] === undefined ? unnamed : labelOf(body.targets[0])
    case 'set-operation':
      return firstLabel(body.left)
    case 'values':
      return 'column1'
    default:
      return unreachable(body)
  }
}

function isStar(e: Expr): boolean {
  return (e.kind === 'column' && e.star) || (e.kind === 'subscript' && e.steps.at(-1)?.kind === 'all-fields')
}
