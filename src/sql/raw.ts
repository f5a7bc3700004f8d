import { refuse } from '../base/refusal.ts'
import { wordsFor } from './raw-words.ts'

/** A value of the parser's tree, as JSON gives it. */
export type Json = null | boolean | number | string | readonly Json[] | { readonly [field: string]: Json }

/** The fields of one node of the parser's tree. */
export type RawFields = { readonly [field: string]: Json }

/** Fields that only say where something was written. */
export const placeFields: ReadonlySet<string> = new Set([
  'location',
  'stmt_location',
  'stmt_len',
  'list_start',
  'list_end',
  'rexpr_list_start',
  'rexpr_list_end',
])

/** Node kinds that the parser gives no place of their own: they stand where their parent stands. */
const placeless: ReadonlySet<string> = new Set([
  'SelectStmt',
  'JoinExpr',
  'RangeSubselect',
  'RangeFunction',
  'A_Indirection',
  'A_Indices',
  'A_Star',
  'List',
  'Alias',
  'IntoClause',
  'String',
  'CaseWhen',
  'InsertStmt',
  'CreateTableAsStmt',
  'ViewStmt',
  'ExplainStmt',
  'PrepareStmt',
  'DeclareCursorStmt',
  'CopyStmt',
  'SetToDefault',
])

/** Whether a value of the tree is an object with fields. */
export function isFields(value: Json | undefined): value is RawFields {
  return typeof value === 'object' && value !== null && !Array.isArray(value)
}

/**
 * One node of the parser's tree while it is being read. Each field is taken by name; `done` refuses the statement when one was not.
 * INVARIANT WHOLE: a node is read only through this class and ends in `done`, so nothing the analyst wrote is ever dropped silently.
 */
export class RawNode {
  readonly tag: string
  /** Byte offset of the node, or of the nearest node above that has one. */
  readonly at: number
  readonly #fields: RawFields
  readonly #taken: string[] = []

  constructor(tag: string, fields: RawFields, above: number) {
    this.tag = tag
    this.#fields = fields
    const location = fields['location']
    const own = typeof location === 'number' ? location : location === undefined && !placeless.has(tag) ? 0 : -1
    this.at = own >= 0 ? own : above
  }

  /** The fields as they came, for a reader that splits the node before it is read. */
  get raw(): RawFields {
    return this.#fields
  }

  /** Takes a child that may be any node; null where there is none. */
  node(field: string): RawNode | null {
    const value = this.#take(field)
    return value === undefined ? null : this.#wrapped(field, value)
  }

  /** Takes a child that must be there. */
  need(field: string): RawNode {
    return this.node(field) ?? this.refuse(field)
  }

  /** Takes a child whose kind the field fixes, so that the parser does not name it. */
  part(field: string, tag: string): RawNode | null {
    const value = this.#take(field)
    if (value === undefined) return null
    return isFields(value) ? new RawNode(tag, value, this.at) : this.refuse(field)
  }

  /** Takes a list of nodes; empty where there is none. */
  nodes(field: string): readonly RawNode[] {
    return this.#list(field).map((item) => this.#wrapped(field, item))
  }

  /** Takes a list in which the parser marks an absent node by an empty object. */
  maybeNodes(field: string): readonly (RawNode | null)[] {
    return this.#list(field).map((item) => (isFields(item) && Object.keys(item).length === 0 ? null : this.#wrapped(field, item)))
  }

  /** Takes a list of String nodes. */
  strings(field: string): readonly string[] {
    return this.nodes(field).map((item) => {
      if (item.tag !== 'String') return this.refuse(field)
      const text = item.text('sval')
      item.done()
      return text
    })
  }

  /** Takes a text; the parser leaves out the empty one. */
  text(field: string): string {
    const value = this.#take(field)
    if (value === undefined) return ''
    return typeof value === 'string' ? value : this.refuse(field)
  }

  /** Takes a truth value; the parser leaves out false. */
  flag(field: string): boolean {
    const value = this.#take(field)
    if (value === undefined) return false
    return typeof value === 'boolean' ? value : this.refuse(field)
  }

  /** Takes a whole number; the parser leaves out 0. */
  number(field: string): number {
    const value = this.#take(field)
    if (value === undefined) return 0
    return typeof value === 'number' && Number.isSafeInteger(value) ? value : this.refuse(field)
  }

  /** Takes an enumeration's label as the value `words` gives it. */
  choice<T>(field: string, words: Readonly<Record<string, T>>): T {
    const label = this.text(field)
    return Object.hasOwn(words, label) ? (words[label] as T) : this.refuse(field)
  }

  /** Holds that a field has the one value that is understood. */
  only(field: string, value: string | number | boolean): void {
    const found = this.#take(field)
    if (found !== value) this.refuse(field)
  }

  /** Whether a field is there; it stays to be taken. */
  has(field: string): boolean {
    return this.#fields[field] !== undefined
  }

  /** Ends the reading of this node: a field that nobody took refuses the statement. */
  done(): void {
    for (const field of Object.keys(this.#fields)) {
      if (this.#taken.includes(field)) continue
      if (placeFields.has(field) && typeof this.#fields[field] === 'number') continue
      this.refuse(field)
    }
  }

  /** Turns the statement away because of this node, or of one field of it. */
  refuse(field = ''): never {
    refuse('text.unreadable', { what: wordsFor(this.tag, field) }, this.at)
  }

  #take(field: string): Json | undefined {
    const value = this.#fields[field]
    if (value !== undefined) this.#taken.push(field)
    return value
  }

  #list(field: string): readonly Json[] {
    const value = this.#take(field)
    if (value === undefined) return []
    return Array.isArray(value) ? (value as readonly Json[]) : this.refuse(field)
  }

  #wrapped(field: string, value: Json): RawNode {
    if (!isFields(value)) return this.refuse(field)
    const tags = Object.keys(value)
    const tag = tags[0]
    const fields = tag === undefined ? undefined : value[tag]
    if (tag === undefined || tags.length !== 1 || !isFields(fields)) return this.refuse(field)
    return new RawNode(tag, fields, this.at)
  }
}
