/**
 * SQL as Hedgerow reads and prints it: one typed tree, for an analyst's statement and for the vault's SQL alike.
 * Positions (`at`) are byte offsets into the UTF-8 text it was read from, -1 in a tree we built; they never take part in equality.
 */

/** A name, qualified or not, each part as PostgreSQL stores it (folded, unquoted). */
export type Name = readonly string[]

export type Constant =
  | { readonly kind: 'integer'; readonly value: string } // fits int4, decimal text, no sign
  | { readonly kind: 'decimal'; readonly value: string } // the text as typed: 1.5, 1e3, 99999999999
  | { readonly kind: 'string'; readonly value: string }
  | { readonly kind: 'bits'; readonly value: string } // as PostgreSQL stores it: b0101 or x1F
  | { readonly kind: 'boolean'; readonly value: boolean }
  | { readonly kind: 'null' }

export interface TypeRef {
  readonly name: Name
  /** Modifiers, as in numeric(10,2). */
  readonly modifiers: readonly Expr[]
  /** One entry a dimension; -1 where no bound was written. */
  readonly array: readonly number[]
  readonly setof: boolean
}

export interface SortItem {
  readonly by: Expr
  readonly direction: 'default' | 'asc' | 'desc' | 'using'
  readonly using: Name
  readonly nulls: 'default' | 'first' | 'last'
}

export interface WindowFrame {
  /** PostgreSQL's frameOptions bits, unchanged. */
  readonly options: number
  readonly start: Expr | null
  readonly end: Expr | null
}

export interface Window {
  /** In a WINDOW clause the name it is defined under; in OVER w, without parentheses, the window meant; '' otherwise. */
  readonly name: string
  /** The named window it extends, as in OVER (w ORDER BY …); '' otherwise. */
  readonly refers: string
  readonly partition: readonly Expr[]
  readonly order: readonly SortItem[]
  readonly frame: WindowFrame
}

export interface Call {
  readonly kind: 'call'
  readonly name: Name
  readonly args: readonly Expr[]
  /** count(*) */
  readonly star: boolean
  readonly distinct: boolean
  readonly variadic: boolean
  /** ORDER BY inside the parentheses, or, with `within`, after WITHIN GROUP. */
  readonly order: readonly SortItem[]
  readonly within: boolean
  readonly filter: Expr | null
  readonly over: Window | null
  /** 'sql' where the grammar has words of its own: EXTRACT(… FROM …), SUBSTRING(… FROM …), AT TIME ZONE and the like. */
  readonly syntax: 'plain' | 'sql'
  readonly at: number
}

export type Sublink = 'exists' | 'any' | 'all' | 'scalar' | 'array'

export type Expr =
  | { readonly kind: 'column'; readonly name: Name; readonly star: boolean; readonly at: number } // t.a; star: t.* or *
  | { readonly kind: 'parameter'; readonly number: number; readonly at: number }
  | { readonly kind: 'constant'; readonly constant: Constant; readonly at: number }
  | Call
  | { readonly kind: 'named-argument'; readonly name: string; readonly value: Expr; readonly at: number }
  /** a + b, - a, a = b; `left` is null for a prefix operator. */
  | { readonly kind: 'operator'; readonly name: Name; readonly left: Expr | null; readonly right: Expr; readonly at: number }
  | { readonly kind: 'logic'; readonly word: 'and' | 'or'; readonly args: readonly Expr[]; readonly at: number }
  | { readonly kind: 'not'; readonly arg: Expr; readonly at: number }
  | { readonly kind: 'is-null'; readonly arg: Expr; readonly negated: boolean; readonly at: number }
  | { readonly kind: 'is-boolean'; readonly arg: Expr; readonly test: 'true' | 'false' | 'unknown'; readonly negated: boolean; readonly at: number }
  /** a IS [NOT] DISTINCT FROM b; `name` is the operator it stands on, ['=']. */
  | { readonly kind: 'distinct'; readonly name: Name; readonly left: Expr; readonly right: Expr; readonly negated: boolean; readonly at: number } // negated: IS NOT DISTINCT FROM
  | { readonly kind: 'in-list'; readonly arg: Expr; readonly list: readonly Expr[]; readonly negated: boolean; readonly at: number }
  | {
      readonly kind: 'between'
      readonly arg: Expr
      readonly low: Expr
      readonly high: Expr
      readonly negated: boolean
      readonly symmetric: boolean
      readonly at: number
    }
  | {
      readonly kind: 'like'
      readonly arg: Expr
      readonly pattern: Expr
      readonly word: 'like' | 'ilike' | 'similar'
      readonly operator: Name
      readonly negated: boolean
      readonly at: number
    }
  | { readonly kind: 'quantified'; readonly left: Expr; readonly name: Name; readonly all: boolean; readonly right: Expr; readonly at: number } // a = ANY (array)
  | { readonly kind: 'nullif'; readonly name: Name; readonly left: Expr; readonly right: Expr; readonly at: number }
  | { readonly kind: 'cast'; readonly arg: Expr; readonly type: TypeRef; readonly at: number }
  | {
      readonly kind: 'case'
      readonly arg: Expr | null
      readonly whens: readonly { readonly when: Expr; readonly then: Expr }[]
      readonly otherwise: Expr | null
      readonly at: number
    }
  | { readonly kind: 'coalesce'; readonly args: readonly Expr[]; readonly at: number }
  | { readonly kind: 'extreme'; readonly word: 'greatest' | 'least'; readonly args: readonly Expr[]; readonly at: number }
  /** current_date and its kin; `precision` -1 where none was written. */
  | { readonly kind: 'value-function'; readonly word: string; readonly precision: number; readonly at: number }
  | { readonly kind: 'row'; readonly args: readonly Expr[]; readonly explicit: boolean; readonly at: number }
  | { readonly kind: 'array'; readonly items: readonly Expr[]; readonly at: number }
  | { readonly kind: 'subscript'; readonly arg: Expr; readonly steps: readonly Subscript[]; readonly at: number }
  | { readonly kind: 'collate'; readonly arg: Expr; readonly collation: Name; readonly at: number }
  | { readonly kind: 'grouping'; readonly args: readonly Expr[]; readonly at: number }
  | { readonly kind: 'default'; readonly at: number }
  /** (SELECT …), EXISTS (…), a IN (…): `test` and `operator` only for any/all; an empty operator is the word IN. */
  | { readonly kind: 'sublink'; readonly link: Sublink; readonly test: Expr | null; readonly operator: Name; readonly query: Query; readonly at: number }

export type Subscript =
  | { readonly kind: 'index'; readonly index: Expr }
  | { readonly kind: 'slice'; readonly low: Expr | null; readonly high: Expr | null }
  | { readonly kind: 'field'; readonly name: string }
  | { readonly kind: 'all-fields' }

export interface Alias {
  readonly name: string
  readonly columns: readonly string[]
}

export interface ColumnDefinition {
  readonly name: string
  readonly type: TypeRef
}

export type JoinType = 'inner' | 'left' | 'right' | 'full'

export type FromItem =
  | { readonly kind: 'table'; readonly name: Name; readonly only: boolean; readonly alias: Alias | null; readonly at: number }
  | { readonly kind: 'subquery'; readonly query: Query; readonly lateral: boolean; readonly alias: Alias | null; readonly at: number }
  | {
      readonly kind: 'function'
      /** Several with `rowsFrom`; a column definition list belongs to one function there, to the alias otherwise. */
      readonly functions: readonly { readonly call: Expr; readonly definitions: readonly ColumnDefinition[] }[]
      readonly rowsFrom: boolean
      readonly lateral: boolean
      readonly ordinality: boolean
      readonly alias: Alias | null
      readonly definitions: readonly ColumnDefinition[]
      readonly at: number
    }
  | {
      readonly kind: 'join'
      readonly type: JoinType
      readonly natural: boolean
      readonly left: FromItem
      readonly right: FromItem
      /** Empty where there is none. */
      readonly using: readonly string[]
      readonly usingAlias: Alias | null
      /** null for CROSS JOIN, NATURAL and USING. */
      readonly on: Expr | null
      readonly alias: Alias | null
      readonly at: number
    }

export interface Target {
  readonly value: Expr
  /** The name after AS; '' where none was written. */
  readonly label: string
  readonly at: number
}

export type GroupItem =
  | { readonly kind: 'expression'; readonly value: Expr }
  | { readonly kind: 'empty'; readonly at: number }
  | { readonly kind: 'sets'; readonly word: 'grouping sets' | 'rollup' | 'cube'; readonly items: readonly GroupItem[]; readonly at: number }

export interface Select {
  readonly kind: 'select'
  /** null: none; []: DISTINCT; else DISTINCT ON. */
  readonly distinct: readonly Expr[] | null
  readonly targets: readonly Target[]
  readonly from: readonly FromItem[]
  readonly where: Expr | null
  readonly group: readonly GroupItem[]
  readonly groupDistinct: boolean
  readonly having: Expr | null
  readonly windows: readonly Window[]
}

export interface SetOperation {
  readonly kind: 'set-operation'
  readonly word: 'union' | 'intersect' | 'except'
  readonly all: boolean
  readonly left: Query
  readonly right: Query
}

export interface Values {
  readonly kind: 'values'
  readonly rows: readonly (readonly Expr[])[]
}

export interface CommonTable {
  readonly name: string
  readonly columns: readonly string[]
  readonly materialized: 'default' | 'always' | 'never'
  readonly query: Query
  readonly at: number
}

export interface Query {
  readonly kind: 'query'
  readonly with: { readonly recursive: boolean; readonly tables: readonly CommonTable[] } | null
  readonly body: Select | SetOperation | Values
  readonly order: readonly SortItem[]
  readonly limit: Expr | null
  readonly offset: Expr | null
  readonly withTies: boolean
}

export interface IntoTable {
  readonly name: Name
  readonly columns: readonly string[]
  readonly persistence: 'permanent' | 'temporary' | 'unlogged'
  readonly onCommit: 'default' | 'preserve' | 'delete' | 'drop'
}

export interface Option {
  readonly name: string
  /** null where only the name was written. */
  readonly value: Constant | null
}

export type Statement =
  | { readonly kind: 'query'; readonly query: Query }
  /** SELECT … INTO [TEMP] t. */
  | { readonly kind: 'select-into'; readonly into: IntoTable; readonly query: Query }
  | { readonly kind: 'create-table-as'; readonly into: IntoTable; readonly statement: Statement; readonly ifNotExists: boolean; readonly withData: boolean }
  | {
      readonly kind: 'create-view'
      readonly name: Name
      readonly columns: readonly string[]
      readonly replace: boolean
      readonly temporary: boolean
      readonly options: readonly Option[]
      readonly query: Query
    }
  | { readonly kind: 'insert'; readonly table: Name; readonly alias: string; readonly columns: readonly string[]; readonly query: Query }
  | { readonly kind: 'declare-cursor'; readonly name: string; readonly options: number; readonly query: Query }
  | { readonly kind: 'copy-to-stdout'; readonly query: Query; readonly options: readonly Option[] }
  | { readonly kind: 'prepare'; readonly name: string; readonly types: readonly TypeRef[]; readonly statement: Statement }
  | { readonly kind: 'explain'; readonly options: readonly Option[]; readonly statement: Statement }
  /** Anything else: its tag as the parser names it (CreateFunctionStmt, LockStmt, …), never read further. */
  | { readonly kind: 'other'; readonly tag: string }

/** One statement of a text: where it stands (bytes), and its tree. */
export interface Placed {
  readonly start: number
  readonly length: number
  readonly statement: Statement
  /** Every relation named anywhere in it, read or not, each once; common tables of its own among them. */
  readonly relations: readonly Name[]
}
