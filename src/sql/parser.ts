import { refuse, Refusal } from '../base/refusal.ts'
import type { Facts, RefusalCode } from '../base/refusal.ts'
import { bracketDepth } from './depth.ts'
import { sameRaw } from './echo.ts'
import { createPool } from './parse-pool.ts'
import { printStatement } from './print.ts'
import type { Json, RawFields } from './raw.ts'
import { readStatement } from './read.ts'
import { relationsOf } from './relations.ts'
import type { Placed, Statement } from './tree.ts'

/** One statement of a text as the parser gives it; `start` and `length` in bytes of UTF-8. */
export interface RawStatement {
  readonly start: number
  readonly length: number
  /** The one-field object that names the node: { SelectStmt: … }. */
  readonly tree: RawFields
}

export type ParseOutcome =
  | { readonly kind: 'parsed'; readonly statements: readonly RawStatement[] }
  /** PostgreSQL will say the same of the text, better: it is forwarded untouched. `at` counts characters. */
  | { readonly kind: 'syntax-error'; readonly message: string; readonly at: number }

/** Why one statement of a text could not be read; `refuse(code, facts, at)` throws it. */
export interface Unread {
  readonly code: RefusalCode
  readonly facts: Facts
  readonly at: number
}

/** A statement, read; or not (`statement` is then of kind 'other'), and why. */
export interface ReadStatement extends Placed {
  readonly refusal: Unread | null
}

export type ReadOutcome =
  | { readonly kind: 'read'; readonly statements: readonly ReadStatement[] }
  | { readonly kind: 'syntax-error'; readonly message: string; readonly at: number }

export interface Parser {
  /** PostgreSQL's own tree of each statement. Refuses (text.too-long, text.too-deep, text.too-slow, text.unreadable) what is not given to the parser or breaks it. */
  parse(text: string): Promise<ParseOutcome>
  /** Our tree of each statement, echo-checked; one statement that cannot be read does not spoil the others. Refuses as `parse` does; a text of our own may have a ceiling of its own. */
  readText(text: string, ceilingBytes?: number): Promise<ReadOutcome>
  close(): Promise<void>
}

export interface ParserOptions {
  /** Longest time one text may take, in milliseconds. */
  readonly watchdogMs?: number
  /** Longest text, in bytes of UTF-8. */
  readonly ceilingBytes?: number
}

/** Brackets within brackets: far below what the parser's stack bears. */
const bracketCeiling = 500
/** Levels of the parser's JSON: about 500 nested expressions, which our own recursion bears with room to spare. */
const treeCeiling = 1500

/** Starts two parser threads, one to work and one to take over. Close it to end them; they do not keep the process alive. */
export function createParser(options: ParserOptions = {}): Parser {
  const { watchdogMs = 2000, ceilingBytes = 65536 } = options
  const pool = createPool({ watchdogMs, stackSizeMb: 16, levels: treeCeiling })

  async function parse(text: string, ceiling = ceilingBytes): Promise<ParseOutcome> {
    admit(text, ceiling)
    if (text === '') return { kind: 'parsed', statements: [] }
    const verdict = await pool.parse(text)
    if (verdict.kind === 'parsed') return { kind: 'parsed', statements: statementsOf(verdict.json, Buffer.byteLength(text)) }
    if (/^(memory exhausted|stack depth limit exceeded)/.test(verdict.message)) refuse('text.too-deep')
    return { kind: 'syntax-error', message: verdict.message, at: verdict.at }
  }

  /** INVARIANT ECHO: a statement that was read prints to a text that PostgreSQL's parser takes for the very same tree, places aside. */
  async function echoes(raw: RawStatement, statement: Statement): Promise<boolean> {
    const verdict = await pool.parse(printStatement(statement))
    if (verdict.kind !== 'parsed') return false
    const [echo, ...more] = statementsOf(verdict.json, 0)
    return echo !== undefined && more.length === 0 && sameRaw(raw.tree, echo.tree)
  }

  async function read(raw: RawStatement): Promise<ReadStatement> {
    const { start, length, tree } = raw
    const relations = relationsOf(tree)
    const unread = (refusal: Unread): ReadStatement => {
      return { start, length, relations, statement: { kind: 'other', tag: tagOf(tree) }, refusal }
    }
    try {
      const statement = readStatement(tree, start)
      const faithful = statement.kind === 'other' || (await echoes(raw, statement))
      if (!faithful) return unread({ code: 'text.unreadable', facts: { what: 'statement' }, at: start })
      return { start, length, relations, statement, refusal: null }
    } catch (error) {
      if (error instanceof Refusal) return unread({ code: error.code, facts: error.facts, at: error.at })
      throw error
    }
  }

  return {
    parse: (text) => parse(text),
    async readText(text, ceiling) {
      const outcome = await parse(text, ceiling)
      if (outcome.kind === 'syntax-error') return outcome
      return { kind: 'read', statements: await Promise.all(outcome.statements.map(read)) }
    },
    close: () => pool.close(),
  }
}

function admit(text: string, ceilingBytes: number): void {
  const length = Buffer.byteLength(text)
  if (length > ceilingBytes) refuse('text.too-long', { ceiling: String(ceilingBytes), length: String(length) })
  if (text.includes('\0') || /\p{Surrogate}/u.test(text)) refuse('text.unreadable', { what: 'text (a NUL or half a character in it)' })
  if (bracketDepth(text) > bracketCeiling) refuse('text.too-deep')
}

function statementsOf(json: string, length: number): readonly RawStatement[] {
  const { stmts = [] } = JSON.parse(json) as { readonly stmts?: readonly RawFields[] }
  return stmts.map((item) => {
    const start = numberOf(item['stmt_location'])
    const own = numberOf(item['stmt_len'])
    return { start, length: own === 0 ? length - start : own, tree: (item['stmt'] ?? {}) as RawFields }
  })
}

function numberOf(value: Json | undefined): number {
  return typeof value === 'number' ? value : 0
}

function tagOf(tree: RawFields): string {
  return Object.keys(tree)[0] ?? ''
}
