import fc from 'fast-check'
import { afterAll, describe, expect, test } from 'vitest'
import { sameExpr, sameTree } from '../../src/sql/equal.ts'
import { createParser } from '../../src/sql/parser.ts'
import { printExpr, printQuery } from '../../src/sql/print.ts'
import type { Query } from '../../src/sql/tree.ts'
import { anyExpr, anyQuery } from './trees.ts'

const parser = createParser()
afterAll(() => parser.close())

async function readBack(text: string): Promise<Query> {
  const outcome = await parser.readText(text)
  const only = outcome.kind === 'read' && outcome.statements.length === 1 ? outcome.statements[0] : undefined
  if (only?.statement.kind !== 'query') throw new Error(`${JSON.stringify(outcome).slice(0, 200)}\n${text}`)
  return only.statement.query
}

describe('a generated tree', () => {
  test('prints to a text that is read as the same expression', async () => {
    await fc.assert(
      fc.asyncProperty(anyExpr, async (expr) => {
        const text = printExpr(expr)
        const { body } = await readBack(`SELECT ${text}`)
        const back = body.kind === 'select' ? body.targets[0]?.value : undefined
        if (back === undefined || !sameExpr(expr, back)) expect.fail(`${text}\n${JSON.stringify(expr)}\n${JSON.stringify(back)}`)
      }),
      { numRuns: 400 },
    )
  })

  test('prints to a text that is read as the same query', async () => {
    await fc.assert(
      fc.asyncProperty(anyQuery, async (query) => {
        const text = printQuery(query)
        const back = await readBack(text)
        if (!sameTree(query, back)) expect.fail(`${text}\n${JSON.stringify(query)}\n${JSON.stringify(back)}`)
      }),
      { numRuns: 400 },
    )
  })
})
