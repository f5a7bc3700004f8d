import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { RefusalCode } from '../../src/base/refusal.ts'
import { Refusal } from '../../src/base/refusal.ts'
import { createParser } from '../../src/sql/parser.ts'
import type { Parser } from '../../src/sql/parser.ts'

/** The code a text is refused with as a whole; 'read' where it is not. */
async function verdict(parser: Parser, text: string): Promise<RefusalCode | 'read' | 'syntax-error'> {
  try {
    return (await parser.readText(text)).kind
  } catch (error) {
    if (error instanceof Refusal) return error.code
    throw error
  }
}

/** The codes its statements are refused with; null for one that is read. */
async function codes(parser: Parser, text: string): Promise<readonly (RefusalCode | null)[]> {
  const outcome = await parser.readText(text)
  return outcome.kind === 'read' ? outcome.statements.map((statement) => statement.refusal?.code ?? null) : []
}

describe('the parser', () => {
  let parser: Parser
  beforeAll(() => {
    parser = createParser()
  })
  afterAll(() => parser.close())

  test('gives each statement its place in bytes, comments before it aside', async () => {
    const text = `/* é */ SELECT 'é';;  SELECT 2 ; -- end\n SELECT 3`
    const outcome = await parser.readText(text)
    const bytes = Buffer.from(text)
    const found = outcome.kind === 'read' ? outcome.statements.map(({ start, length }) => bytes.subarray(start, start + length).toString()) : []
    expect(found.map((piece) => piece.trim())).toEqual([`SELECT 'é'`, 'SELECT 2', 'SELECT 3'])
  })

  test('finds nothing in a text without statements', async () => {
    for (const text of ['', ' ', ';', '-- only a comment', '/* and another */;;']) expect(await parser.readText(text)).toEqual({ kind: 'read', statements: [] })
  })

  test('leaves a syntax error to PostgreSQL, and its place with it', async () => {
    expect(await parser.readText(`SELECT 'é' FRM x y`)).toEqual({ kind: 'syntax-error', message: 'syntax error at or near "x"', at: 15 })
    expect(await verdict(parser, 'SELECT 1; SELEC 2')).toBe('syntax-error')
    expect(await verdict(parser, `SELECT 'open`)).toBe('syntax-error')
  })

  test('lists every relation a statement names anywhere, whatever its kind', async () => {
    const relations = async (text: string): Promise<readonly string[]> => {
      const outcome = await parser.readText(text)
      return outcome.kind === 'read' ? outcome.statements.flatMap((statement) => statement.relations.map((name) => name.join('.'))) : []
    }
    expect(await relations('SELECT (SELECT 1 FROM a.b) FROM c JOIN d ON x IN (SELECT y FROM e), c')).toEqual(['a.b', 'c', 'd', 'e'])
    expect(await relations('WITH q AS (DELETE FROM trips RETURNING *) SELECT * FROM q')).toEqual(['q', 'trips'])
    expect(await relations('LOCK TABLE trips, ferries.public.riders')).toEqual(['trips', 'ferries.public.riders'])
    expect(await relations('COPY trips TO STDOUT')).toEqual(['trips'])
    expect(await relations('CREATE FUNCTION f() RETURNS int BEGIN ATOMIC SELECT count(*) FROM trips; END')).toEqual(['trips'])
    expect(await relations('MERGE INTO a USING trips ON true WHEN MATCHED THEN DO NOTHING')).toEqual(['a', 'trips'])
    expect(await relations('SELECT 1 FROM trips TABLESAMPLE system (1)')).toEqual(['trips'])
    expect(await relations('CREATE RULE r AS ON INSERT TO a DO ALSO SELECT * FROM trips')).toEqual(['a', 'trips'])
  })

  test('refuses one statement without spoiling the others', async () => {
    expect(await codes(parser, 'SELECT 1; SELECT 1 FROM t FOR UPDATE; SELECT 2; SELECT JSON_ARRAY(1)')).toEqual([
      null,
      'text.unreadable',
      null,
      'text.unreadable',
    ])
  })

  test('refuses what is too long, by bytes', async () => {
    const padded = (length: number): string => `SELECT '${'x'.repeat(length - 9)}'`
    expect(await verdict(parser, padded(65536))).toBe('read')
    expect(await verdict(parser, padded(65537))).toBe('text.too-long')
    expect(await verdict(parser, `SELECT '${'é'.repeat(32764)}'`)).toBe('text.too-long')
    expect(await verdict(parser, `SELECT '${'x'.repeat(1 << 20)}'`)).toBe('text.too-long')
  })

  test('refuses NUL and lone surrogates, where the parser would read another text', async () => {
    for (const text of ['SELECT 1\0 FROM trips', `SELECT '\ud800'`, `SELECT '\udc00\ud800'`]) expect(await verdict(parser, text)).toBe('text.unreadable')
    expect(await verdict(parser, `SELECT '\u{1f600}'`)).toBe('read')
  })

  test('refuses 10,000 nested parentheses and goes on working', async () => {
    expect(await verdict(parser, `SELECT ${'('.repeat(10_000)}1${')'.repeat(10_000)}`)).toBe('text.too-deep')
    expect(await verdict(parser, '('.repeat(10_000))).toBe('text.too-deep')
    expect(await verdict(parser, 'SELECT 1')).toBe('read')
  })

  test('counts brackets of the statement alone, not those of texts, names and comments', async () => {
    const many = '('.repeat(2000)
    const texts = [
      `'${many}'`,
      `E'it\\'s ${many}'`,
      `"${many.slice(0, 60)}"`,
      `$$${many}$$`,
      `$a$ $b$ ${many} $a$`,
      `1 /* ${many} /* */ ${many} */`,
      `1 -- ${many}`,
      `(1), `.repeat(1000) + '1',
    ]
    for (const text of texts) expect(await verdict(parser, `SELECT ${text}`)).toBe('read')
    expect(await verdict(parser, `SELECT '(' || ${many} /* ) */`)).toBe('text.too-deep')
  })

  // Each of them nests the parser's stack or the tree in another way; none may break the parser, nor our own recursion.
  const nests: Readonly<Record<string, (n: number) => string>> = {
    'a long sum': (n) => `SELECT ${'1+'.repeat(n)}1`,
    'a chain of NOT': (n) => `SELECT ${'NOT '.repeat(n)}a`,
    'a chain of signs': (n) => `SELECT ${'- '.repeat(n)}a`,
    'CASE in CASE': (n) => `SELECT ${'CASE WHEN '.repeat(n)}a${' THEN 1 END'.repeat(n)}`,
    'array in array': (n) => `SELECT ${'ARRAY['.repeat(n)}1${']'.repeat(n)}`,
    'a long union': (n) => Array(n).fill('SELECT 1').join(' UNION '),
    'a chain of casts': (n) => `SELECT a${'::int'.repeat(n)}`,
    'a long join': (n) => `SELECT 1 FROM t${' CROSS JOIN t'.repeat(n)}`,
    'a chain of subscripts': (n) => `SELECT a${'[1]'.repeat(n)}`,
    'subquery in subquery': (n) => `SELECT ${'(SELECT '.repeat(n)}1${')'.repeat(n)}`,
    'a chain of COLLATE': (n) => `SELECT a${' COLLATE "C"'.repeat(n)}`,
    'a long OR': (n) => `SELECT a${' OR b'.repeat(n)}`,
  }
  test.each(Object.entries(nests))('outlives %s of any length', async (_, nest) => {
    for (const count of [50, 200, 450, 1000, 4000, 16_000]) {
      const text = nest(count)
      const found = Buffer.byteLength(text) > 65536 ? 'text.too-long' : await verdict(parser, text)
      expect(['read', 'text.too-deep', 'text.too-long']).toContain(found)
      if (count <= 200) expect(await codes(parser, text)).toEqual([null])
    }
    expect(await verdict(parser, 'SELECT 1')).toBe('read')
  })

  test('answers 200 texts asked at once, each with its own tree', async () => {
    const outcomes = await Promise.all(Array.from({ length: 200 }, (_, index) => parser.readText(`SELECT ${index}`)))
    const values = outcomes.map((outcome) => {
      const statement = outcome.kind === 'read' ? outcome.statements[0]?.statement : undefined
      const body = statement?.kind === 'query' ? statement.query.body : undefined
      const value = body?.kind === 'select' ? body.targets[0]?.value : undefined
      return value?.kind === 'constant' && value.constant.kind === 'integer' ? Number(value.constant.value) : -1
    })
    expect(values).toEqual(Array.from({ length: 200 }, (_, index) => index))
  })
})

describe('the watchdog', () => {
  test('ends a text that takes too long, and the next text is answered', async () => {
    const parser = createParser({ watchdogMs: 1, ceilingBytes: 1 << 24 })
    try {
      const slow = `SELECT ${Array(400_000).fill('a').join(', ')}`
      const found = await Promise.all([verdict(parser, slow), verdict(parser, slow)])
      expect(found).toEqual(['text.too-slow', 'text.too-slow'])
    } finally {
      await parser.close()
    }
  })

  test('a broken instance is never used again', async () => {
    const parser = createParser({ watchdogMs: 20_000, ceilingBytes: 1 << 22 })
    try {
      for (let round = 0; round < 2; round += 1) {
        expect(await verdict(parser, `SELECT ${'1+'.repeat(150_000)}1`)).toBe('text.too-deep')
        expect(await codes(parser, 'SELECT 1 + 2 FROM t')).toEqual([null])
      }
    } finally {
      await parser.close()
    }
  })

  test('closing answers what is still asked', async () => {
    const parser = createParser()
    const asked = Promise.all([verdict(parser, 'SELECT 1'), verdict(parser, 'SELECT 2')])
    await parser.close()
    for (const found of await asked) expect(['read', 'text.too-slow']).toContain(found)
  })
})
