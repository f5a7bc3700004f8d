import { exprText } from './print-expr.ts'
import { typeText } from './print-parts.ts'
import type { Printer } from './print-port.ts'
import { levels } from './print-port.ts'
import { queryText } from './print-query.ts'
import { statementText } from './print-statement.ts'
import type { Expr, Query, Statement, TypeRef } from './tree.ts'

export { quoteName, quoteString } from './quote.ts'

const printer: Printer = {
  expr: (e, level = levels.any) => exprText(e, level, printer),
  query: (q) => queryText(q, printer),
}

/** A statement as SQL, without a semicolon; PostgreSQL reads it back as the same tree. One of kind 'other' stops with our own bug. */
export function printStatement(statement: Statement): string {
  return statementText(statement, printer)
}

/** A query as SQL, without parentheses around it. */
export function printQuery(query: Query): string {
  return printer.query(query)
}

/** An expression as SQL, for a place that takes any expression, as a target or WHERE. */
export function printExpr(expr: Expr): string {
  return printer.expr(expr)
}

/** A type as SQL. */
export function printType(type: TypeRef): string {
  return typeText(type, printer)
}
