import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { gaussianTail } from '../../src/noise/gaussian-law.ts'
import { laplaceTail } from '../../src/noise/laplace-law.ts'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'
import { type Case, readCases } from './case-file.ts'
import { ferryPolicy, ferryVault } from './ferry.ts'
import { complaintOf, type Outcome, runStatement, session, sqlInHint } from './run-case.ts'

let server: TestHedgerow
let vaultUrl: string
let reader: pg.Client
let analyst: pg.Client
let vaultTypes: ReadonlyMap<number, string>
let lobbyTypes: ReadonlyMap<number, string>
const cases = readCases()

beforeAll(async () => {
  server = await testHedgerow({
    vault: ferryVault,
    policy: ferryPolicy,
    analysts: { ana: '{ epsilon: 1e33, delta: 1e-3, renews: never }' },
    everyone: '{ epsilon: 1e33, delta: 1e-3 }',
  })
  const vault = await server.vault()
  const { host, port, database, user, password } = vault
  vaultUrl = `postgresql://${user ?? ''}:${encodeURIComponent(password ?? '')}@${host}:${port.toString()}/${database ?? ''}`
  reader = await session(vaultUrl)
  analyst = await session(server.url('ana'))
  vaultTypes = await madeTypes(reader)
  lobbyTypes = await madeTypes(analyst)
})
afterAll(async () => {
  await Promise.all([reader, analyst].map((client) => client.end()))
  await server.stop()
})

const tooLikely = Fraction.parse('1e-12')

/** P(noise ≠ 0) of an output, from what the analyst is told about it alone. */
function probabilityOfNoise(mechanism: string, scale: string): Fraction {
  const [n = '', d = '1'] = scale.split('/')
  const parameter = Fraction.make(BigInt(n), BigInt(d))
  const oneSide = mechanism === 'laplace' ? laplaceTail(parameter, 1n) : gaussianTail(parameter, 1n)
  return oneSide.add(oneSide)
}

interface Stated {
  readonly output: string
  readonly mechanism: string
  readonly scale: string
  readonly id: string
}

/** Holds that whatever has been released last in this session had no noise in it; gives the ids of the releases. */
async function holdNoiseless(client: pg.Client): Promise<ReadonlySet<string>> {
  const { rows } = await client.query<Stated>('SELECT output, mechanism, scale, id FROM hedgerow.last_answer')
  for (const row of rows) expect(probabilityOfNoise(row.mechanism, row.scale).isLess(tooLikely), `${row.output} has noise`).toBe(true)
  return new Set(rows.map((row) => row.id))
}

async function spent(client: pg.Client): Promise<string> {
  const { rows } = await client.query<{ spent: string }>("SELECT epsilon_spent || ' ' || delta_spent AS spent FROM hedgerow.budget WHERE account = 'ana'")
  return rows[0]?.spent ?? ''
}

interface Ran {
  readonly outcomes: readonly Outcome[]
  readonly releases: ReadonlySet<string>
}

async function runAll(client: pg.Client, statements: readonly string[], each: Case, after: (client: pg.Client) => Promise<ReadonlySet<string>>): Promise<Ran> {
  const outcomes: Outcome[] = []
  const releases = new Set<string>()
  for (const text of statements) {
    outcomes.push(await runStatement(client, text, each))
    for (const id of await after(client)) releases.add(id)
  }
  return { outcomes, releases }
}

/** A case of several statements may leave things behind in its session, so it has one of its own. */
async function withSession<T>(each: Case, shared: pg.Client, url: string, work: (client: pg.Client) => Promise<T>): Promise<T> {
  if (each.statements.length === 1) return await work(shared)
  const own = await session(url)
  try {
    return await work(own)
  } finally {
    await own.end()
  }
}

const nothing = (): Promise<ReadonlySet<string>> => Promise.resolve(new Set())

/** Releases that a case has been answered with before. */
const known = new Set<string>()

async function ask(each: Case): Promise<Ran> {
  return withSession(each, analyst, server.url('ana'), async (client) => {
    const charged = each.free ? await spent(client) : ''
    const ran = await runAll(client, each.statements, each, holdNoiseless)
    const fresh = [...ran.releases].filter((id) => !known.has(id))
    for (const id of fresh) known.add(id)
    if (each.free) expect(await spent(client), 'a free statement costs nothing').toBe(charged)
    else if (each.statements.some((text) => /\b(?:count|sum|avg)\(/.test(text))) expect(fresh.length, 'every output says how noisy it is').toBeGreaterThan(0)
    return ran
  })
}

/** What PostgreSQL itself answers: to the statements, and to those in their place where the case gives any. */
async function askVault(each: Case): Promise<readonly [Ran, Ran | null]> {
  const { instead } = each
  const want = await withSession(each, reader, vaultUrl, (client) => runAll(client, each.statements, each, nothing))
  const other =
    instead === null ? null : await withSession({ ...each, statements: instead }, reader, vaultUrl, (client) => runAll(client, instead, each, nothing))
  return [want, other]
}

function inOrder(rows: Outcome['rows'], ordered: boolean): readonly string[] {
  const texts = rows.map((row) => JSON.stringify(row))
  return ordered ? texts : texts.sort()
}

/** A type made in a database has another oid in each: it is compared by its name. */
function typed(names: ReadonlyMap<number, string>): (column: Outcome['columns'][number]) => string {
  return (column) => `${column.name} ${names.get(column.type) ?? column.type.toString()}`
}

async function madeTypes(client: pg.Client): Promise<ReadonlyMap<number, string>> {
  const { rows } = await client.query<{ oid: string; name: string }>(
    "SELECT t.oid, n.nspname || '.' || t.typname AS name FROM pg_type t JOIN pg_namespace n ON n.oid = t.typnamespace WHERE t.oid >= 16384",
  )
  return new Map(rows.map((row) => [Number(row.oid), row.name]))
}

function holdSame(each: Case, got: Outcome, want: Outcome, instead: Outcome | null, extra: Case['extra']): void {
  expect(got.columns.map(typed(lobbyTypes)), 'columns and their types').toEqual(want.columns.map(typed(vaultTypes)))
  expect(got.command, 'the command tag').toBe(want.command)
  const expected = instead === null ? [...want.rows, ...extra] : instead.rows
  expect(inOrder(got.rows, each.ordered), 'rows').toEqual(inOrder(expected, each.ordered))
  expect(got.copied.split('\n').sort(), 'what COPY sent').toEqual((instead ?? want).copied.split('\n').sort())
}

/** That a case which says it differs does, and in that way only. */
function holdDifference(each: Case, got: Ran, want: Ran): void {
  const [a, b] = [got, want].map((ran) => ran.outcomes.flatMap((outcome) => inOrder(outcome.rows, false).concat(outcome.copied.split('\n'))))
  const [ours = [], theirs = []] = [a, b]
  expect(ours, 'the case shows the difference it declares').not.toEqual(theirs)
  if (each.differs === 'empty groups' && each.instead === null) expect(each.extra.length).toBeGreaterThan(0)
  if (each.differs === 'single-person groups') for (const row of ours) expect(theirs, 'a group that is shown is one of PostgreSQL’s').toContain(row)
  if (each.differs === 'rounding') expect(ours.length).toBe(theirs.length)
}

const answered = cases.filter((each) => each.refused === null)

describe.each([...new Set(answered.map((each) => each.name.split('/')[0] ?? ''))])('%s', (topic) => {
  test.each(answered.filter((each) => each.name.startsWith(`${topic}/`)).map((each) => [each.name.slice(topic.length + 1), each.title, each] as const))(
    '%s: %s',
    async (_name, _title, each) => {
      const [got, [want, other]] = await Promise.all([ask(each), askVault(each)])
      for (const [i, outcome] of got.outcomes.entries()) {
        const [theirs, also] = [want.outcomes[i], other === null ? null : other.outcomes[i]]
        expect(theirs).toBeDefined()
        if (theirs !== undefined) holdSame(each, outcome, theirs, also ?? null, i === got.outcomes.length - 1 ? each.extra : [])
      }
      if (each.differs === null) expect([each.extra.length, each.instead]).toEqual([0, null])
      else holdDifference(each, got, want)
    },
  )
})

const refused = cases.filter((each) => each.refused !== null)

test.each(refused.map((each) => [each.name, each.title, each] as const))('refused, %s: %s', async (_name, _title, each) => {
  const charged = await spent(analyst)
  const text = each.statements[0] ?? ''
  const complaint = await complaintOf(runStatement(analyst, text, each))
  expect(complaint.message).toContain(`[${each.refused ?? ''}]`)
  expect(complaint.code).toMatch(/^(?:42501|42803|22023)$/)
  expect(await spent(analyst), 'a refusal costs nothing').toBe(charged)
  const remedy = sqlInHint(complaint.hint)
  expect(remedy, `the hint holds SQL: ${complaint.hint}`).not.toBeNull()
  await expect(analyst.query(remedy ?? ''), remedy ?? '').resolves.toBeDefined()
})

test('the corpus is as large as it says', () => {
  expect(cases.length).toBeGreaterThanOrEqual(250)
})
