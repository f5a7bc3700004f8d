import fc from 'fast-check'
import { readFileSync } from 'node:fs'
import { expect, test } from 'vitest'
import { readAnalystsFile, readDataSetFile } from '../../src/policy/read.ts'

const shipped = ['ferries.yaml', 'analysts.yaml'].map((name) => readFileSync(new URL(`../../policies/${name}`, import.meta.url), 'utf8'))
const scrap = fc.constantFrom(
  '',
  ' ',
  '\n',
  '\t',
  ':',
  '- ',
  '{',
  '}',
  '[',
  ']',
  '"',
  "'",
  '&a',
  '*a',
  '!!int ',
  '#',
  '|',
  '>',
  '? ',
  ', ',
  '0',
  '-1',
  '1e9',
  '~',
  'true',
  'x:',
  '\n  y: z\n',
  '<<: ',
  '%',
  '\u0000',
  '\ud800',
  '\u2028',
)

test('no text makes the reader throw, and every complaint has a place in it, a message and a remedy', () => {
  fc.assert(
    fc.property(fc.constantFrom(...shipped), fc.array(fc.tuple(fc.nat(2500), fc.nat(12), scrap), { minLength: 1, maxLength: 4 }), (whole, edits) => {
      let text = whole
      for (const [at, cut, put] of edits) text = text.slice(0, at) + put + text.slice(at + cut)
      for (const outcome of [readDataSetFile(text, 'f'), readAnalystsFile(text, 'f')]) {
        if (outcome.kind !== 'complaints') continue
        expect(outcome.complaints.length).toBeGreaterThan(0)
        const lines = text.split('\n')
        for (const { line, column, message, remedy } of outcome.complaints) {
          expect(line).toBeLessThanOrEqual(lines.length)
          expect(column).toBeLessThanOrEqual((lines[line - 1]?.length ?? 0) + 1)
          expect(message).toMatch(/^\S.*[^.]$/su)
          expect(remedy).not.toBe('')
        }
      }
    }),
    { numRuns: 150 },
  )
}, 20_000)
