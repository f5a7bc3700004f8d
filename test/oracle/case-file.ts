import { readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { check } from '../../src/base/check.ts'

/** What the design changes on purpose; a case says which of them it shows. */
const differences = ['empty groups', 'single-person groups', 'padding', 'rounding'] as const
type Difference = (typeof differences)[number]

export interface Parameter {
  readonly type: string
  readonly value: string | null
}

/** An analyst's statement, or a few that belong together, in one file of test/cases. The README of that folder states the format. */
export interface Case {
  readonly name: string
  readonly title: string
  readonly statements: readonly string[]
  readonly differs: Difference | null
  /** Rows that Hedgerow gives and PostgreSQL does not: empty groups. */
  readonly extra: readonly (readonly (string | null)[])[]
  /** The statements that PostgreSQL is given in their place to say what the rows are; null where they are the same. */
  readonly instead: readonly string[] | null
  readonly refused: string | null
  readonly free: boolean
  readonly ordered: boolean
  readonly binary: boolean
  readonly parameters: readonly Parameter[]
}

const root = fileURLToPath(new URL('../cases', import.meta.url))
const words = ['differs', 'extra', 'refused', 'free', 'ordered', 'binary', 'parameter']

/** Every case of test/cases, in the order of their names. */
export function readCases(): readonly Case[] {
  const names = readdirSync(root, { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith('.sql'))
    .sort()
  return names.map((name) => parseCase(name.replace(/\.sql$/, ''), readFileSync(join(root, name), 'utf8')))
}

function parseCase(name: string, text: string): Case {
  const lines = text.split('\n')
  const body = lines.findIndex((line) => !line.startsWith('-- '))
  const header = lines.slice(0, body).map((line) => line.slice(3))
  const [title = '', ...facts] = header
  check(title !== '' && body > 0, `${name} starts with its title`)
  const said = facts.map((fact) => {
    const [word = '', ...rest] = fact.split(':')
    check(words.includes(word), `${name} says what it is in known words, unlike ${fact}`)
    return { word, value: rest.join(':').trim() }
  })
  const values = (word: string): readonly string[] => said.filter((each) => each.word === word).map((each) => each.value)
  const differs = values('differs')[0] ?? null
  check(differs === null || isDifference(differs), `${name} differs in a known way`)
  const rest = lines.slice(body)
  const split = rest.indexOf('-- instead')
  return {
    name,
    title,
    statements: statementsOf(split < 0 ? rest : rest.slice(0, split)),
    differs,
    extra: values('extra').map((value) => JSON.parse(value) as (string | null)[]),
    instead: split < 0 ? null : statementsOf(rest.slice(split + 1)),
    refused: values('refused')[0] ?? null,
    free: values('free').length > 0,
    ordered: values('ordered').length > 0,
    binary: values('binary').length > 0,
    parameters: values('parameter').map(parameterOf),
  }
}

function isDifference(text: string): text is Difference {
  return (differences as readonly string[]).includes(text)
}

function parameterOf(text: string): Parameter {
  const [type = '', ...rest] = text.split(' ')
  const value = rest.join(' ')
  return { type, value: value === 'NULL' ? null : value }
}

/** A statement ends with a semicolon at the end of a line. */
function statementsOf(lines: readonly string[]): readonly string[] {
  return lines
    .join('\n')
    .split(/;[ \t]*(?:\n|$)/)
    .map((text) => text.trim())
    .filter((text) => text !== '')
}
