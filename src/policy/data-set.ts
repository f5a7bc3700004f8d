import type { CatalogType } from '../catalog/catalog.ts'

/**
 * A policy that fits the vault's catalogue: what the planner works from. Made by `fit.ts` only.
 * Amounts are decimal texts as the DBA wrote them, so that nothing passes through a double.
 */
export interface DataSet {
  readonly name: string
  /** sha256 of the policy file's text, hex. */
  readonly policyHash: string
  readonly schema: string
  /** What the DBA calls a person: rider. */
  readonly personCalled: string
  readonly personTable: string // schema.table
  readonly personColumn: string
  readonly personType: CatalogType
  readonly defaults: { readonly epsilon: string; readonly delta: string }
  readonly replyAfterMs: number
  /** The account's stem: system identifier, person table and column. */
  readonly personKey: string
  /** Keyed by `schema.name`. */
  readonly tables: ReadonlyMap<string, DataTable>
  /** True where some listed private column has no declared domain, so that keys may need selection. */
  readonly hasUndeclaredKeys: boolean
}

export type DataTable = PrivateTable | PublishedTable

export interface PublishedTable {
  readonly kind: 'published'
  readonly schema: string
  readonly name: string
  readonly columns: ReadonlyMap<string, DataColumn>
  readonly uniqueKeys: readonly (readonly string[])[]
  readonly primaryKey: readonly string[] | null
}

/** How a row finds its person: the column itself, or steps from table to table ending at one with a person column. */
export type Owner =
  | { readonly kind: 'column'; readonly column: string }
  /** from.[column] = table.[referenced], which is proved unique there; the last step's table has `person`. */
  | {
      readonly kind: 'through'
      readonly steps: readonly { readonly column: string; readonly table: string; readonly referenced: string }[]
      readonly person: string
    }

export interface PrivateTable {
  readonly kind: 'private'
  readonly schema: string
  readonly name: string
  readonly owner: Owner
  /** Groups a person may touch; rows in each. */
  readonly bounds: { readonly groups: number; readonly rows: number }
  /** Proved: at most one row per person (only with owner.kind column). */
  readonly onePerPerson: boolean
  readonly columns: ReadonlyMap<string, DataColumn>
  readonly uniqueKeys: readonly (readonly string[])[]
  readonly primaryKey: readonly string[] | null
}

export interface DataColumn {
  readonly name: string
  readonly type: CatalogType
  readonly notNull: boolean
  readonly deterministic: boolean
  /** The collation of a text column where it is not the database's own. */
  readonly collation?: string | null
  /** 'linking': the person's key, `by` and `through` columns: in the shell, usable in joins, refused in output. */
  readonly role: 'listed' | 'linking'
  /** Literals of the column's type. */
  readonly clamp: readonly [string, string] | null
  /** Decimal text, greater than 0; numbers only. */
  readonly step: string | null
  readonly values: readonly string[] | null
  readonly valuesFrom: { readonly table: string; readonly column: string } | null
}

export interface Cap {
  readonly epsilon: string
  readonly delta: string
  readonly renews: 'never' | 'month' | 'quarter' | 'year'
}

export interface Analyst {
  readonly name: string
  /** A PostgreSQL SCRAM verifier, or null until `hedgerow password` set one. */
  readonly login: string | null
  /** Keyed by data set name. */
  readonly data: ReadonlyMap<string, Cap>
}

export interface Policies {
  readonly dataSets: ReadonlyMap<string, DataSet>
  readonly analysts: ReadonlyMap<string, Analyst>
  /** The cap over all analysts, keyed by data set name; every data set an analyst has must be here. */
  readonly everyone: ReadonlyMap<string, Cap>
}
