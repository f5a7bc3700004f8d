import pg from 'pg'

/** A name as SQL, always quoted. */
export function name(text: string): string {
  return pg.escapeIdentifier(text)
}

/** A string constant as SQL, whatever standard_conforming_strings says. */
export function literal(text: string): string {
  return pg.escapeLiteral(text)
}

/** schema.name as SQL. */
export function qualified(schema: string, relation: string): string {
  return `${name(schema)}.${name(relation)}`
}

/** (a, b, c) as SQL names. */
export function names(list: readonly string[]): string {
  return list.map(name).join(', ')
}
