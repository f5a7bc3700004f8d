import { afterAll, describe, expect, test } from 'vitest'
import { createParser } from '../../src/sql/parser.ts'
import { printStatement } from '../../src/sql/print.ts'
import { corpus } from './corpus.ts'

const parser = createParser()
afterAll(() => parser.close())

describe.each(Object.entries(corpus))('%s', (_, texts) => {
  test.each(texts)('reads, prints and echoes: %s', async (text) => {
    const outcome = await parser.readText(text)
    expect(outcome).toMatchObject({ kind: 'read', statements: [{ refusal: null }] })
    const statement = outcome.kind === 'read' ? outcome.statements[0]?.statement : undefined
    expect(statement?.kind).not.toBe('other')
    // Printing is settled: what was printed prints the same again.
    const printed = statement === undefined ? '' : printStatement(statement)
    const again = await parser.readText(printed)
    expect(again.kind === 'read' && again.statements[0] && printStatement(again.statements[0].statement)).toBe(printed)
  })
})
