import type pg from 'pg'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { ferries, ferryPolicy } from '../clients/ferries.ts'
import type { TestHedgerow } from '../harness/hedgerow.ts'

let server: TestHedgerow
beforeAll(async () => {
  server = await ferries({
    policy: ferryPolicy.replace('defaults: { epsilon: 1e30, delta: 1e-8 }', 'defaults: { epsilon: 1, delta: 1e-8 }'),
    // room for one statement of epsilon 1 and no second
    analysts: {
      ana: '{ epsilon: 1.5, delta: 1e-6, renews: never }',
      ben: '{ epsilon: 9, delta: 1e-6, renews: never }',
      cleo: '{ epsilon: 9, delta: 1e-6, renews: never }',
    },
    everyone: '{ epsilon: 4, delta: 1e-5 }',
  })
})
afterAll(() => server.stop())

interface Outcome {
  readonly passed: number
  readonly refusals: readonly string[]
}

async function race(clients: readonly pg.Client[], texts: readonly string[]): Promise<Outcome> {
  const refusals: string[] = []
  let passed = 0
  const left = [...texts]
  await Promise.all(
    clients.map(async (client) => {
      for (let text = left.pop(); text !== undefined; text = left.pop()) {
        await client.query(text).then(
          () => (passed += 1),
          (problem: pg.DatabaseError) => refusals.push(`${problem.code ?? ''} ${problem.message}`),
        )
      }
    }),
  )
  return { passed, refusals }
}

async function open(analyst: string, count: number): Promise<readonly pg.Client[]> {
  return Promise.all(Array.from({ length: count }, () => server.connect(analyst, { options: '-c hedgerow.noise=laplace' })))
}

const different = (count: number): readonly string[] =>
  Array.from({ length: count }, (_, i) => `SELECT count(*) + ${i.toString()} AS n FROM riders WHERE birth_year <> ${(1900 + (i % 120)).toString()}`)

test('of 200 different statements that race for the last charge of an account exactly one passes', async () => {
  const { passed, refusals } = await race(await open('ana', 16), different(200))
  expect(passed).toBe(1)
  expect(refusals).toHaveLength(199)
  for (const refusal of refusals)
    expect(refusal).toMatch(/^42501 your budget cannot bear this statement: it asks for epsilon 1, and epsilon 0\.5 or rho .*\[budget\.spent\]$/)
  const [client] = await open('ana', 1)
  expect((await client!.query('SELECT epsilon_spent FROM hedgerow.budget')).rows).toEqual([{ epsilon_spent: '1' }, { epsilon_spent: '1' }])
  expect((await client!.query('SELECT epsilon FROM hedgerow.charges')).rows).toEqual([{ epsilon: '1' }])
})

test('two analysts who race together pass no more than everyone’s cap bears', async () => {
  const clients = [...(await open('ben', 8)), ...(await open('cleo', 8))]
  const { passed, refusals } = await race(clients, different(60))
  expect(passed).toBe(3)
  expect(refusals.every((refusal) => refusal.startsWith("42501 everyone's budget cannot bear"))).toBe(true)
  expect((await clients[0]!.query("SELECT epsilon_spent FROM hedgerow.budget WHERE account = 'everyone'")).rows).toEqual([{ epsilon_spent: '4' }])
})
