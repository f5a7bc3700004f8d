import { createHash } from 'node:crypto'
import { mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { Limits } from '../../src/plan/limits.ts'
import { caseCount } from '../harness/cases.ts'
import { testServer, type TestServer } from '../harness/server.ts'
import { type Fault, faults } from './faults.ts'
import { hazards } from './hazards.ts'
import { type Asked, Harbour, type Loaded, timeZones, type Who } from './neighbours.ts'
import type { Cell } from './odd-values.ts'
import { type Random, seeded } from './random.ts'
import { shrinkRows, shrinkStatement } from './shrink.ts'
import { type FuzzStatement, sqlOf, statementOf } from './statements.ts'
import { type Rows, rowsOf, tablesOf, type World, worlds } from './worlds.ts'

/** A failure as it is kept. */
interface Kept {
  readonly what: string
  readonly world: World
  /** By table, each row by the names of its columns; a column that is not named is NULL. */
  readonly rows: Readonly<Record<string, readonly Readonly<Record<string, Cell>>[]>>
  readonly who: Who
  readonly sql: string
  readonly timeZone: string
  readonly groups: string | null
  readonly rowLimit: string | null
  readonly salts: readonly string[]
}

const regressions = fileURLToPath(new URL('../regressions/', import.meta.url))

let server: TestServer
let harbour: Harbour

beforeAll(async () => {
  server = await testServer()
  harbour = await Harbour.open(await server.createDatabase('fuzz'))
})

afterAll(async () => {
  await harbour.close()
  await server.stop()
})

function personsOf(rows: Rows): readonly string[] {
  return [
    ...new Set(
      ['riders', 'passes', 'legs']
        .flatMap((name) => (rows[name] ?? []).map((row) => row[0] ?? null))
        .concat((rows['trips'] ?? []).map((row) => row[1] ?? null)),
    ),
  ].filter((each) => each !== null)
}

/** A few persons, the one with the most rows among them; and nobody, where rows may lack their person. */
function someOf(world: World, rows: Rows, random: Random): readonly Who[] {
  const persons = personsOf(rows)
  const heaviest = persons.toSorted((a, b) => tripsOf(rows, b) - tripsOf(rows, a))[0]
  const some = new Set<Who>([heaviest ?? null, random.pick(persons), random.pick(persons)])
  return [...some, ...(world.orphans ? [null] : [])]
}

function tripsOf(rows: Rows, person: string): number {
  return (rows['trips'] ?? []).filter((row) => row[1] === person).length
}

function limitsFrom(random: Random): Limits {
  return { groups: random.pick([null, 1n, 2n, 3n]), rows: random.pick([null, 1n, 2n]) }
}

/** What is wrong with a statement over that data: null for nothing, `refused` where it is no case. */
async function faultOf(
  sql: string,
  loaded: Loaded,
  timeZone: string,
  limits: Limits,
  salt: () => bigint,
  onCase: () => void = () => undefined,
): Promise<string | null> {
  const reading = await harbour.read(sql, loaded, timeZone, limits, salt)
  if (reading.kind === 'refused') return 'refused'
  if (reading.kind === 'broken') return reading.why
  await harbour.inZone(timeZone)
  for (const block of reading.blocks) {
    const verdict = await harbour.compare(block, loaded, block.plan, block.groups, onCase)
    if (verdict.kind === 'violation') return verdict.what
  }
  return null
}

function repeating(salts: readonly bigint[]): () => bigint {
  let at = 0
  return () => salts[at++ % salts.length] ?? 0n
}

function named(world: World, rows: Rows): Kept['rows'] {
  const cells = (row: readonly Cell[], names: readonly string[]): Readonly<Record<string, Cell>> =>
    Object.fromEntries(names.flatMap((name, i) => (row[i] == null ? [] : [[name, row[i]]])))
  return Object.fromEntries(
    tablesOf(world).map(({ name, columns }) => [
      name,
      (rows[name] ?? []).map((row) =>
        cells(
          row,
          columns.map((column) => column.name),
        ),
      ),
    ]),
  )
}

function unnamed(world: World, rows: Kept['rows']): Rows {
  return Object.fromEntries(
    tablesOf(world).map(({ name, columns }) => [name, (rows[name] ?? []).map((row) => columns.map((column) => row[column.name] ?? null))]),
  )
}

async function replay(kept: Kept): Promise<string | null> {
  const loaded = await harbour.load(kept.world, unnamed(kept.world, kept.rows), [kept.who])
  try {
    const limits = { groups: kept.groups === null ? null : BigInt(kept.groups), rows: kept.rowLimit === null ? null : BigInt(kept.rowLimit) }
    const fault = await faultOf(kept.sql, loaded, kept.timeZone, limits, repeating(kept.salts.map(BigInt)))
    return fault === 'refused' ? null : fault
  } finally {
    await harbour.drop(loaded)
  }
}

/** Makes a failure small, keeps it as a file, and returns what to say. */
async function keep(what: string, statement: FuzzStatement, first: Omit<Kept, 'what' | 'sql'>, persons: readonly Who[]): Promise<string> {
  const fails = async (kept: Kept): Promise<boolean> => (await replay(kept)) !== null
  let kept: Kept = { ...first, what, sql: sqlOf(statement) }
  for (const who of persons) {
    if (!(await fails({ ...kept, who }))) continue
    kept = { ...kept, who }
    const smaller = await shrinkStatement(statement, async (candidate) => fails({ ...kept, sql: sqlOf(candidate) }))
    kept = { ...kept, sql: sqlOf(smaller) }
    const fewer = await shrinkRows(unnamed(kept.world, kept.rows), async (rows) => fails({ ...kept, rows: named(kept.world, rows) }))
    kept = { ...kept, rows: named(kept.world, fewer) }
    break
  }
  const text = `${JSON.stringify(kept, null, 1)}\n`
  const file = `${regressions}neighbours-${createHash('sha256').update(kept.sql).digest('hex').slice(0, 12)}.json`
  mkdirSync(regressions, { recursive: true })
  writeFileSync(file, text)
  return `${what}\n${kept.sql}\nkept in ${file}`
}

describe('failures of the past', () => {
  const files = readdirSync(regressions).filter((name) => name.startsWith('neighbours-'))
  test.each(files)('%s stays mended', async (file) => {
    const kept = JSON.parse(readFileSync(regressions + file, 'utf8')) as Kept
    expect(await replay(kept), kept.sql).toBeNull()
  })
})

test.each([
  ['int8', true, 45],
  ['varchar', false, 45],
  ['text', true, 20],
])('known hazards are refused or sound for persons of type %s', { timeout: 180_000 }, async (person, orphans, heavy) => {
  const random = seeded(heavy)
  const world = { person, orphans }
  const rows = rowsOf(world, random, heavy)
  const loaded = await harbour.load(world, rows, someOf(world, rows, random))
  const found: string[] = []
  for (const [what, sql] of hazards)
    for (const [timeZone, limits] of [
      ['UTC', { groups: null, rows: null }],
      ['Europe/Paris', { groups: 1n, rows: 1n }],
    ] as const) {
      const fault = await faultOf(sql, loaded, timeZone, limits, random.salt)
      if (fault !== null && fault !== 'refused') found.push(`${what}: ${fault.slice(0, 300)}: ${sql}`)
    }
  await harbour.drop(loaded)
  expect(found).toEqual([])
})

test(
  'one person moves no more groups, and none further, than the plan states; no query raises; whatever the data',
  { timeout: process.env['HEDGEROW_TEST_CASES'] === undefined ? 300_000 : 0 },
  async () => {
    const wanted = caseCount(1000)
    const fuzzing = wanted > 1000
    const shapes = new Map<string, { asked: number; accepted: number }>()
    let [cases, accepted, asked] = [0, 0, 0]
    for (let round = 0; cases < wanted; round += 1) {
      const world = worlds[round % worlds.length] ?? { person: 'int4', orphans: true }
      const random = seeded(fuzzing ? Date.now() + round : round + 1)
      const rows = rowsOf(world, random, round % 9 === 4 ? 330 : random.pick([0, 8, 45]))
      const persons = someOf(world, rows, random)
      const loaded = await harbour.load(world, rows, persons)
      const enough = cases + Math.max(90, Math.ceil(wanted / worlds.length / 20))
      while (cases < Math.min(wanted, enough)) {
        const statement = statementOf(world, random)
        const [limits, timeZone] = [limitsFrom(random), random.pick(timeZones)]
        const salts = Array.from({ length: 5 }, random.salt)
        const fault = await faultOf(sqlOf(statement), loaded, timeZone, limits, repeating(salts), () => (cases += 1))
        const shape = shapes.get(statement.shape) ?? { asked: 0, accepted: 0 }
        shapes.set(statement.shape, shape)
        asked += 1
        shape.asked += 1
        if (fault === 'refused') continue
        accepted += 1
        shape.accepted += 1
        if (fault === null) continue
        const kept = {
          world,
          rows: named(world, rows),
          who: null,
          timeZone,
          groups: limits.groups?.toString() ?? null,
          rowLimit: limits.rows?.toString() ?? null,
          salts: salts.map(String),
        }
        expect.fail(await keep(fault, statement, kept, persons))
      }
      await harbour.drop(loaded)
    }
    if (fuzzing)
      console.log(
        `${cases.toString()} cases; accepted by shape: ${[...shapes].map(([name, { asked: all, accepted: some }]) => `${name} ${some.toString()}/${all.toString()}`).join(', ')}`,
      )
    expect(accepted / asked, 'statements that are accepted').toBeGreaterThan(0.5)
    for (const [name, shape] of shapes) if (shape.asked >= 25) expect(shape.accepted, `statements of the shape ${name} that are accepted`).toBeGreaterThan(0)
  },
)

describe('the check sees what it is for', () => {
  const most = 600

  /** Cases until the fault shows, or null. */
  async function casesUntilSeen(fault: Fault): Promise<number | null> {
    let cases = 0
    for (let round = 0; cases < most; round += 1) {
      const random = seeded(1000 + round)
      const world = { person: ['int4', 'text', 'int8'][round % 3] ?? 'int4', orphans: true }
      const rows = rowsOf(world, random, 45)
      const loaded = await harbour.load(world, rows, someOf(world, rows, random))
      for (let i = 0; i < 400 && cases < (round + 1) * 150; i += 1) {
        const statement = statementOf(world, random)
        const [limits, timeZone] = [limitsFrom(random), random.pick(timeZones)]
        if (fault.shapes.length > 0 && !fault.shapes.includes(statement.shape)) continue
        const reading = await harbour.read(sqlOf(statement), loaded, timeZone, limits, random.salt)
        if (reading.kind !== 'asked') continue
        await harbour.inZone(timeZone)
        for (const block of reading.blocks) {
          const planted: Asked | null = fault.plant(block)
          if (planted === null) continue
          const verdict = await harbour.compare(planted, loaded, block.plan, block.groups, () => (cases += 1))
          // an error shows a fault too, but proves nothing of the check
          if (verdict.kind === 'violation' && !verdict.what.startsWith('the vault raised')) return cases
        }
      }
      await harbour.drop(loaded)
    }
    return null
  }

  test.each(faults)('$what', { timeout: 180_000 }, async (fault) => {
    const cases = await casesUntilSeen(fault)
    console.log(`${fault.what}: seen after ${String(cases)} cases`)
    expect(cases).not.toBeNull()
  })
})
