import type pg from 'pg'
import type { DataSet } from '../policy/data-set.ts'
import { rowsOf } from './session.ts'

/** What the lobby copies of the vault's definitions, and a policy does not carry. */
export interface VaultShape {
  /** Keyed by `schema.name`. */
  readonly tables: ReadonlyMap<string, TableShape>
  /** Types that are no part of PostgreSQL, each after those it is made of. */
  readonly types: readonly TypeShape[]
}

export interface TableShape {
  /** In the vault's order; types printed with their schema. */
  readonly columns: readonly { readonly name: string; readonly type: string }[]
  /** Primary key and plain unique and other btree indexes over columns. */
  readonly indexes: readonly { readonly name: string; readonly kind: 'primary' | 'unique' | 'plain'; readonly columns: readonly string[] }[]
  readonly foreignKeys: readonly {
    readonly name: string
    readonly columns: readonly string[]
    readonly table: string
    readonly referenced: readonly string[]
  }[]
}

export type TypeShape =
  | { readonly kind: 'enum'; readonly schema: string; readonly name: string; readonly labels: readonly string[] }
  | { readonly kind: 'domain'; readonly schema: string; readonly name: string; readonly base: string }
  /** A type the lobby must have already: an extension's, a composite, a range. */
  | { readonly kind: 'other'; readonly schema: string; readonly name: string }

const relations = `SELECT c.oid, n.nspname || '.' || c.relname AS key FROM pg_class c JOIN pg_namespace n ON n.oid = c.relnamespace
  WHERE n.nspname || '.' || c.relname = ANY ($1::text[]) AND c.relkind IN ('r', 'p', 'v', 'm', 'f')`

const columnsText = `WITH rel AS (${relations})
  SELECT rel.key, a.attname, format_type(a.atttypid, a.atttypmod)
    FROM rel JOIN pg_attribute a ON a.attrelid = rel.oid AND a.attnum > 0 AND NOT a.attisdropped ORDER BY rel.key, a.attnum`

const indexesText = `WITH rel AS (${relations})
  SELECT rel.key, c.relname, CASE WHEN i.indisprimary THEN 'primary' WHEN i.indisunique THEN 'unique' ELSE 'plain' END,
         (SELECT json_agg(a.attname ORDER BY k.place) FROM unnest(i.indkey::int2[]) WITH ORDINALITY AS k(attnum, place)
            JOIN pg_attribute a ON a.attrelid = i.indrelid AND a.attnum = k.attnum WHERE k.place <= i.indnkeyatts)
    FROM rel JOIN pg_index i ON i.indrelid = rel.oid JOIN pg_class c ON c.oid = i.indexrelid JOIN pg_am m ON m.oid = c.relam
   WHERE i.indisvalid AND i.indexprs IS NULL AND i.indpred IS NULL AND m.amname = 'btree' ORDER BY rel.key, c.relname`

const foreignKeysText = `WITH rel AS (${relations})
  SELECT rel.key, f.conname, target.key,
         (SELECT json_agg(a.attname ORDER BY k.place) FROM unnest(f.conkey) WITH ORDINALITY AS k(attnum, place)
            JOIN pg_attribute a ON a.attrelid = f.conrelid AND a.attnum = k.attnum),
         (SELECT json_agg(a.attname ORDER BY k.place) FROM unnest(f.confkey) WITH ORDINALITY AS k(attnum, place)
            JOIN pg_attribute a ON a.attrelid = f.confrelid AND a.attnum = k.attnum)
    FROM rel JOIN pg_constraint f ON f.conrelid = rel.oid AND f.contype = 'f' JOIN rel AS target ON target.oid = f.confrelid ORDER BY rel.key, f.conname`

const typesText = `WITH RECURSIVE rel AS (${relations}), used(oid, depth) AS (
    SELECT a.atttypid, 0 FROM rel JOIN pg_attribute a ON a.attrelid = rel.oid AND a.attnum > 0 AND NOT a.attisdropped
     WHERE rel.key || '.' || a.attname = ANY ($2::text[])
    UNION
    SELECT CASE WHEN t.typtype = 'd' THEN t.typbasetype ELSE t.typelem END, used.depth + 1
      FROM used JOIN pg_type t ON t.oid = used.oid WHERE t.typtype = 'd' OR t.typcategory = 'A')
  SELECT n.nspname, t.typname, t.typtype::text, format_type(t.typbasetype, t.typtypmod),
         (SELECT json_agg(e.enumlabel ORDER BY e.enumsortorder) FROM pg_enum e WHERE e.enumtypid = t.oid)
    FROM (SELECT oid, max(depth) AS depth FROM used GROUP BY oid) u JOIN pg_type t ON t.oid = u.oid JOIN pg_namespace n ON n.oid = t.typnamespace
   WHERE n.nspname <> 'pg_catalog' AND t.typcategory <> 'A' ORDER BY u.depth DESC, n.nspname, t.typname`

/** Reads the shape of a data set's tables; `vault` must be in a transaction. */
export async function readVaultShape(vault: pg.Client, dataSet: DataSet): Promise<VaultShape> {
  await vault.query("SET LOCAL search_path = ''")
  const keys = [...dataSet.tables.keys()]
  const visible = [...dataSet.tables].flatMap(([key, table]) => [...table.columns.keys()].map((column) => `${key}.${column}`))
  const columns = grouped(await rowsOf(vault, columnsText, [keys]))
  const indexes = grouped(await rowsOf(vault, indexesText, [keys]))
  const foreignKeys = grouped(await rowsOf(vault, foreignKeysText, [keys]))
  const types = await rowsOf(vault, typesText, [keys, visible])
  const tables = new Map<string, TableShape>()
  for (const [key, list] of columns) {
    tables.set(key, {
      columns: list.map(([, name, type]) => ({ name: name ?? '', type: type ?? '' })),
      indexes: (indexes.get(key) ?? []).map(([, name, kind, on]) => ({ name: name ?? '', kind: indexKind(kind ?? ''), columns: namesIn(on) })),
      foreignKeys: (foreignKeys.get(key) ?? []).map(([, name, table, on, to]) => ({
        name: name ?? '',
        table: table ?? '',
        columns: namesIn(on),
        referenced: namesIn(to),
      })),
    })
  }
  return { tables, types: types.map(typeShape) }
}

function typeShape([schema, name, kind, base, labels]: readonly (string | null)[]): TypeShape {
  const named = { schema: schema ?? '', name: name ?? '' }
  if (kind === 'e') return { kind: 'enum', ...named, labels: namesIn(labels) }
  if (kind === 'd') return { kind: 'domain', ...named, base: base ?? '' }
  return { kind: 'other', ...named }
}

function indexKind(text: string): 'primary' | 'unique' | 'plain' {
  return text === 'primary' || text === 'unique' ? text : 'plain'
}

function namesIn(json: string | null | undefined): readonly string[] {
  return json === null || json === undefined ? [] : (JSON.parse(json) as string[])
}

function grouped(rows: readonly (readonly (string | null)[])[]): ReadonlyMap<string, readonly (readonly (string | null)[])[]> {
  const groups = new Map<string, (readonly (string | null)[])[]>()
  for (const row of rows) {
    const key = row[0] ?? ''
    const group = groups.get(key)
    if (group === undefined) groups.set(key, [row])
    else group.push(row)
  }
  return groups
}
