const wordForm = /^[a-z][a-z0-9_]{0,62}$/
const reservedWords = new Set([
  'postgres',
  'hedgerow',
  'replication',
  'all',
  'sameuser',
  'samerole',
  'template0',
  'template1',
  'public',
  'none',
  'current_user',
  'current_role',
  'session_user',
  'user',
])

/** Why a text cannot name a database or a role of the lobby; null where it can. */
export function wordComplaint(word: string): string | null {
  if (!wordForm.test(word)) return 'is not a lower-case word of letters, digits and _, at most 63 long, that begins with a letter'
  if (reservedWords.has(word) || word.startsWith('pg_') || word.startsWith('hedgerow_')) return 'is a name that PostgreSQL or the proxy keeps for itself'
  return null
}

/** The parts of `table` or `schema.table` or `schema.table.column`, exactly as the catalogue spells them; null where a part is no identifier. */
export function nameParts(name: string): readonly string[] | null {
  const parts = name.split('.')
  return parts.every((part) => part !== '' && part === part.trim() && Buffer.byteLength(part) <= 63 && !/[\p{Cc}"]/u.test(part)) ? parts : null
}

/** `schema.table`, the key under which catalogue and data set know a table. `parts` has one or two. */
export function tableKey(name: string, schema: string): string {
  return name.includes('.') ? name : `${schema}.${name}`
}

/** `riders.rider_id` or `public.riders.rider_id` → the table's key and the column. */
export function columnReference(reference: string, schema: string): { readonly table: string; readonly column: string } {
  const dot = reference.lastIndexOf('.')
  return { table: tableKey(reference.slice(0, dot), schema), column: reference.slice(dot + 1) }
}
