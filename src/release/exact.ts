import { BrokenCheck, check } from '../base/check.ts'
import type { Debit } from '../budget/debit.ts'

/** One group before noise. Keys are PostgreSQL's text; values are in the grid's integer units. */
export interface ExactRow {
  readonly keys: readonly (string | null)[]
  readonly values: readonly bigint[]
}

let read: (table: ExactTable) => readonly ExactRow[]

/**
 * The vault's answer before noise, sealed. INVARIANT ONE DOOR: `sealExact` makes it, `openExact` takes the rows out once and against a debit; it has nothing to
 * print, to spread, to copy or to compare.
 */
export class ExactTable {
  #rows: readonly ExactRow[] | null

  static {
    read = (table) => {
      const rows = table.#rows
      check(rows !== null, 'an exact table is opened once')
      table.#rows = null
      return rows
    }
  }

  constructor(rows: readonly ExactRow[]) {
    this.#rows = rows
    Object.freeze(this)
  }

  toJSON(): never {
    throw new BrokenCheck('an exact table is not printed')
  }

  [Symbol.toPrimitive](): never {
    throw new BrokenCheck('an exact table is not printed')
  }

  [Symbol.for('nodejs.util.inspect.custom')](): string {
    return 'ExactTable'
  }
}

/** Reads one row of the vault; every total is a decimal integer, exactly. A BrokenCheck, which quotes nothing of the row, for any other shape. */
export function exactRow(columns: readonly (string | null)[], keyCount: number, totalCount: number): ExactRow {
  check(columns.length === keyCount + totalCount, 'a row of the vault has its keys and its totals')
  return { keys: columns.slice(0, keyCount), values: columns.slice(keyCount).map(integerOf) }
}

/** For vault/ alone: seals what it read. */
export function sealExact(rows: readonly ExactRow[]): ExactTable {
  return new ExactTable(rows)
}

/** For release/ alone: the rows, once, and the ledger's id of the debit that pays for them, which is used up (by INVARIANT DEBITED). */
export function openExact(table: ExactTable, debit: Debit): { readonly debit: string; readonly totals: readonly ExactRow[] } {
  const id = debit.use()
  return { debit: id, totals: read(table) }
}

function integerOf(text: string | null): bigint {
  check(text !== null && /^-?\d{1,100000}$/.test(text), 'a total of the vault is an integer')
  return BigInt(text)
}
