/** One function that the grammar gives words of its own. */
export interface SqlForm {
  /** Numbers of arguments that have a form; TRIM alone has no ceiling in the grammar, and none here below 100. */
  readonly counts: readonly number[]
  /**
   * `full`: words and parentheses around whole expressions. `infix`: an operator's shape, its operands closed.
   * Arguments stand as $1, $2, …; $n! is an argument that must be closed (a primary or in parentheses), $n? one that is a bare word.
   */
  readonly forms: readonly string[]
  readonly level: 'primary' | 'is' | 'at'
}

const upTo100 = Array.from({ length: 100 }, (_, index) => index + 1)

/** The functions of pg_catalog with words of their own in PostgreSQL 18's gram.y, by name; `forms` go by the index of the count. */
export const sqlForms: Readonly<Record<string, SqlForm>> = {
  timezone: { counts: [1, 2], forms: ['$1! AT LOCAL', '$2! AT TIME ZONE $1!'], level: 'at' },
  is_normalized: { counts: [1, 2], forms: ['$1! IS NORMALIZED', '$1! IS $2? NORMALIZED'], level: 'is' },
  overlaps: { counts: [4], forms: ['($1, $2) OVERLAPS ($3, $4)'], level: 'is' },
  pg_collation_for: { counts: [1], forms: ['COLLATION FOR ($1)'], level: 'primary' },
  extract: { counts: [2], forms: ['EXTRACT($1 FROM $2)'], level: 'primary' },
  normalize: { counts: [1, 2], forms: ['NORMALIZE($1)', 'NORMALIZE($1, $2?)'], level: 'primary' },
  overlay: { counts: [3, 4], forms: ['OVERLAY($1 PLACING $2 FROM $3)', 'OVERLAY($1 PLACING $2 FROM $3 FOR $4)'], level: 'primary' },
  position: { counts: [2], forms: ['POSITION($2! IN $1!)'], level: 'primary' },
  substring: { counts: [2, 3], forms: ['SUBSTRING($1 FROM $2)', 'SUBSTRING($1 FROM $2 FOR $3)'], level: 'primary' },
  btrim: { counts: upTo100, forms: ['TRIM(BOTH FROM $*)'], level: 'primary' },
  ltrim: { counts: upTo100, forms: ['TRIM(LEADING FROM $*)'], level: 'primary' },
  rtrim: { counts: upTo100, forms: ['TRIM(TRAILING FROM $*)'], level: 'primary' },
  system_user: { counts: [0], forms: ['SYSTEM_USER'], level: 'primary' },
}
