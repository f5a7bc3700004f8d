import type { DataSet } from '../policy/data-set.ts'

/**
 * A cheap test on raw bytes: whether a text may name a private table of the data set. It errs on the side of yes; a name it cannot see (written with Unicode
 * escapes) reaches a shell that holds no rows and raises.
 */
export function mentionTest(dataSet: DataSet): (text: Uint8Array) => boolean {
  const names = [...dataSet.tables.values()].filter((table) => table.kind === 'private').map((table) => table.name)
  if (names.length === 0) return () => false
  const pattern = new RegExp(names.map(bytesOf).map(escape).join('|'), 'i')
  return (text) => pattern.test(Buffer.from(text.buffer, text.byteOffset, text.byteLength).toString('latin1'))
}

/** The name as its UTF-8 bytes look in latin1; a quote inside is written twice in SQL. */
function bytesOf(name: string): string {
  return Buffer.from(name.replaceAll('"', '""'), 'utf8').toString('latin1')
}

function escape(text: string): string {
  return text.replace(/[.*+?^${}()|[\]\\]/g, '\\$&')
}
