/** The vault's shape as plain values: read once a policy load by the vault's edge, compared with the policy by `policy/fit.ts`. */

export interface CatalogType {
  readonly schema: string
  readonly name: string // pg_type.typname: int4, timestamptz, …
  /** As format_type prints it with its modifier: numeric(10,2). */
  readonly printed: string
  readonly modifier: number
  readonly kind: 'base' | 'enum' | 'domain' | 'other'
  /** Labels in order, for an enum. */
  readonly labels: readonly string[]
}

export interface CatalogColumn {
  readonly name: string
  readonly type: CatalogType
  readonly notNull: boolean
  /** False for a text column under a nondeterministic collation. */
  readonly deterministic: boolean
  /** The collation of a text column, as schema.name; null or absent for the database's own. */
  readonly collation?: string | null
}

export interface ForeignKey {
  readonly columns: readonly string[]
  readonly schema: string
  readonly table: string
  readonly referenced: readonly string[]
}

export interface CatalogTable {
  readonly schema: string
  readonly name: string
  /** Only an ordinary or declaratively partitioned table without inheritance children proves uniqueness. */
  readonly kind: 'ordinary' | 'partitioned' | 'inherited' | 'view' | 'foreign' | 'other'
  readonly columns: readonly CatalogColumn[]
  readonly primaryKey: readonly string[] | null
  /** Column sets proved unique: valid, immediate, non-partial unique index on plain columns, all NOT NULL. */
  readonly uniqueKeys: readonly (readonly string[])[]
  readonly foreignKeys: readonly ForeignKey[]
  /** schema.table of every relation a view reads, at any depth, and of the children and partitions of a table; 'schema.name()' for a function that a view calls. */
  readonly readsFrom: readonly string[]
}

export interface Catalog {
  /** The cluster's system identifier, decimal text. */
  readonly systemIdentifier: string
  readonly serverVersion: number
  readonly tables: readonly CatalogTable[]
}
