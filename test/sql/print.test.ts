import { Client } from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { BrokenCheck } from '../../src/base/check.ts'
import { createParser } from '../../src/sql/parser.ts'
import { printExpr, printStatement, printType, quoteName, quoteString } from '../../src/sql/print.ts'
import type { Expr } from '../../src/sql/tree.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'

const parser = createParser()
afterAll(() => parser.close())

async function printed(text: string): Promise<string> {
  const outcome = await parser.readText(text)
  const statement = outcome.kind === 'read' ? outcome.statements[0] : undefined
  if (statement === undefined || statement.refusal !== null) throw new Error(`not read: ${text}`)
  return printStatement(statement.statement)
}

describe('what is printed reads well', () => {
  const same = [
    `SELECT p.zone, count(*), sum(t.fare_pence) FILTER (WHERE t.fare_pence > 100) FROM piers AS p LEFT JOIN trips AS t ON t.from_pier = p.pier_id WHERE t.delay_min IS NOT NULL GROUP BY 1 HAVING count(*) > 10 ORDER BY 2 DESC NULLS LAST LIMIT 20`,
    `SELECT a OR b AND c, (a OR b) AND c, a - (b - c), a - b - c, -1, - a, NOT (a = b), (a, b) = (1, 2)`,
    `SELECT a::int4, (a + b)::text, a[1], (t.c).f, a AT TIME ZONE 'UTC', EXTRACT('year' FROM a), SUBSTRING(a FROM 1 FOR 2)`,
    `SELECT a LIKE b ESCAPE '!', a BETWEEN 1 AND 2, a IN (1, 2), a IN (SELECT 1), EXISTS (SELECT 1), a = ANY (b)`,
    `WITH a (x) AS MATERIALIZED (SELECT 1) SELECT * FROM a UNION ALL (SELECT 2 LIMIT 1)`,
    `SELECT sum(a) OVER (PARTITION BY b ORDER BY c ROWS BETWEEN 1 PRECEDING AND CURRENT ROW) FROM t`,
    `SELECT a FROM t GROUP BY GROUPING SETS ((a, b), (), ROLLUP (a, (b, c)))`,
    `SELECT a INTO TEMPORARY TABLE t FROM u`,
    `COPY (SELECT 1) TO STDOUT CSV HEADER DELIMITER ','`,
  ]
  test.each(same)('%s', async (text) => {
    expect(await printed(text)).toBe(text)
  })
})

describe('names and texts', () => {
  test('a name is quoted unless it is a plain lower-case word', () => {
    expect(['a', 'rider_id', '_x1', 'text', 'day'].map(quoteName)).toEqual(['a', 'rider_id', '_x1', 'text', 'day'])
    expect(['A', 'a b', 'a"b', '1a', 'é', 'a$', 'select', 'user', 'rows'].map(quoteName)).toEqual([
      '"A"',
      '"a b"',
      '"a""b"',
      '"1a"',
      '"é"',
      '"a$"',
      '"select"',
      '"user"',
      '"rows"',
    ])
  })

  test('a name cannot be empty, and neither it nor a text holds NUL', () => {
    expect(() => quoteName('')).toThrow(BrokenCheck)
    expect(() => quoteName('a\0')).toThrow(BrokenCheck)
    expect(() => quoteString('a\0')).toThrow(BrokenCheck)
  })

  test('a text with a backslash is an E string', () => {
    expect(quoteString(`it's`)).toBe(`'it''s'`)
    expect(quoteString(`a\\'b`)).toBe(`E'a\\\\''b'`)
  })
})

describe('a tree that no text can hold stops with our own bug, never with another text', () => {
  const one: Expr = { kind: 'constant', constant: { kind: 'integer', value: '1' }, at: -1 }
  const constant = (kind: 'integer' | 'decimal' | 'bits', value: string): Expr => ({ kind: 'constant', constant: { kind, value }, at: -1 })
  const wrong: Readonly<Record<string, Expr>> = {
    'a signed integer': constant('integer', '-1'),
    'an integer with something after it': constant('integer', '1; DROP TABLE t'),
    'a decimal with something after it': constant('decimal', '1.5 OR true'),
    'a bit string with a quote': constant('bits', "b1' OR '1"),
    'an operator of letters': { kind: 'operator', name: ['or'], left: one, right: one, at: -1 },
    'an operator that opens a comment': { kind: 'operator', name: ['--'], left: one, right: one, at: -1 },
    'AND of one': { kind: 'logic', word: 'and', args: [one], at: -1 },
    'IN of nothing': { kind: 'in-list', arg: one, list: [], negated: false, at: -1 },
    'a row of one without the word': { kind: 'row', args: [one], explicit: false, at: -1 },
    'a value function of more than a word': { kind: 'value-function', word: 'user; x', precision: -1, at: -1 },
    'a name without parts': { kind: 'column', name: [], star: false, at: -1 },
  }
  test.each(Object.entries(wrong))('%s', (_, expr) => {
    expect(() => printExpr(expr)).toThrow(BrokenCheck)
  })

  test('a statement that was not read', () => {
    expect(() => printStatement({ kind: 'other', tag: 'LockStmt' })).toThrow(BrokenCheck)
  })
})

test('a type is printed in the generic spelling', () => {
  const one: Expr = { kind: 'constant', constant: { kind: 'integer', value: '10' }, at: -1 }
  expect(printType({ name: ['pg_catalog', 'numeric'], modifiers: [one, one], array: [-1, 3], setof: false })).toBe('pg_catalog.numeric(10, 10)[][3]')
})

describe('PostgreSQL gives the printed text the answer and the types it gives the first', () => {
  let client: Client
  let server: TestServer
  beforeAll(async () => {
    server = await testServer()
    client = new Client({ connectionString: await server.createDatabase('printed') })
    await client.connect()
    await client.query(`CREATE TYPE pair AS (x int, "Y" text); CREATE TABLE "Odd table" (a int, "select" text, "quo""te" pair, t timestamptz)`)
    await client.query(`INSERT INTO "Odd table" VALUES (1, 'x', (1, 'p'), '2026-01-01 12:00Z'), (2, 'y', (2, 'q'), '2026-06-01 12:00Z'), (2, NULL, NULL, NULL)`)
  })
  afterAll(async () => {
    await client.end()
    await server.stop()
  })

  const statements = [
    `SELECT INTERVAL '1' DAY, interval '1.5' second(1), interval(0) '1.7 s', INTERVAL '1-2' YEAR TO MONTH, '1 2:03:04'::interval day to minute, INTERVAL '12' HOUR`,
    `SELECT 'abc'::char, 'abc'::char(2), 'abc'::varchar(2), 'a'::"char", 1.255::numeric(4, 2), 12345::numeric(3, -3), b'101'::bit(2), b'101'::bit varying(2), 1.5::float(3), 1.5::float(30)`,
    `SELECT '10:00:00.55'::time(1), '2026-01-01 10:00:00.55Z'::timestamptz(1), '2026-01-01 10:00:00.55'::timestamp(0), '10:00Z'::time with time zone, ARRAY[1, 2]::text[], '{{1,2}}'::int[][]`,
    `SELECT 'back\\slash', E'tab\\t', E'\\'', U&'\\00e9', $$it's$$, N'x', x'1F', b'', '', 0, -0.0, -2147483648, -9223372036854775808`,
    `SELECT 2 ^ 3 ^ 2, - 2 ^ 2, -(2 ^ 2), 7 / 2 * 2, 7 - 2 - 1, 7 - (2 - 1), 1 + 2 || 'x', 5 % 3 * 2, @ -5, |/ 16, - -1, 2 - -1`,
    `SELECT true OR false AND false, (true OR false) AND false, NOT true = false, NOT (true IS NULL), (1 < 2) = true, 1 BETWEEN 0 AND 2 AND true, NULL IS DISTINCT FROM 1`,
    `SELECT 'a%' LIKE 'a!%' ESCAPE '!', 'ab' SIMILAR TO 'a(b|c)', 'a_b' NOT LIKE 'a\\_c', 'x' = ANY (ARRAY['x']), 1 <> ALL (SELECT 2), (1, 2) IN ((1, 2), (3, 4)), 'abc' ILIKE ANY (ARRAY['A%'])`,
    `SELECT EXTRACT(year FROM t), t AT TIME ZONE 'UTC', t AT TIME ZONE INTERVAL '2' HOUR, date_trunc('month', t) FROM "Odd table" ORDER BY t`,
    `SELECT SUBSTRING('abcdef' FROM 2 FOR 3), SUBSTRING('abcdef' FOR 2), SUBSTRING('abcdef' SIMILAR 'a#"%#"f' ESCAPE '#'), POSITION('c' IN 'abc'), TRIM(BOTH 'x' FROM 'xax'), TRIM(LEADING FROM ' a'), OVERLAY('abc' PLACING 'x' FROM 2 FOR 1), NORMALIZE('é', NFD) IS NFD NORMALIZED, COLLATION FOR ('a' COLLATE "C"), (DATE '2026-01-01', DATE '2026-02-01') OVERLAPS (DATE '2026-01-15', INTERVAL '1' MONTH)`,
    `SELECT o."select", (o."quo""te").x, ("quo""te")."Y", (o."quo""te").*, o.* FROM "Odd table" AS o ORDER BY a, o."select" NULLS FIRST`,
    `SELECT a, "select", count(*), grouping(a, "select") FROM "Odd table" GROUP BY GROUPING SETS (ROLLUP (a, "select"), ()) ORDER BY 1, 2, 3, 4`,
    `SELECT DISTINCT ON (a) a, "select" FROM "Odd table" ORDER BY a, "select" DESC NULLS LAST`,
    `SELECT a, sum(a) OVER w, count(*) OVER (w ROWS BETWEEN 1 PRECEDING AND CURRENT ROW EXCLUDE TIES), string_agg("select", ',' ORDER BY "select" DESC) FILTER (WHERE a > 1) OVER () FROM (SELECT a, "select" FROM "Odd table") s GROUP BY a, "select" WINDOW w AS (ORDER BY a)`.replace(
      `, string_agg("select", ',' ORDER BY "select" DESC) FILTER (WHERE a > 1) OVER ()`,
      '',
    ),
    `SELECT string_agg(DISTINCT "select", ',' ORDER BY "select" DESC), percentile_cont(ARRAY[0.5, 0.9]) WITHIN GROUP (ORDER BY a DESC), count(*) FILTER (WHERE a = 2), mode() WITHIN GROUP (ORDER BY "select") FROM "Odd table"`,
    `WITH RECURSIVE n (i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n WHERE i < 5), m AS NOT MATERIALIZED (SELECT 9) SELECT sum(i), (SELECT * FROM m) FROM n`,
    `(SELECT 1 UNION ALL SELECT 1) EXCEPT ALL SELECT 1`,
    `SELECT 1 UNION ALL (SELECT 2 INTERSECT SELECT 2) UNION (SELECT 3 ORDER BY 1 LIMIT 1) ORDER BY 1 OFFSET 1`,
    `SELECT a FROM "Odd table" ORDER BY a DESC FETCH FIRST 1 ROWS WITH TIES`,
    `SELECT * FROM ROWS FROM (generate_series(1, 2), unnest(ARRAY['x'])) WITH ORDINALITY AS r (n, u, o)`,
    `SELECT * FROM json_to_record('{"a": 1, "B": "x"}') AS r (a int, "B" varchar(3))`,
    `SELECT * FROM (VALUES (1, 'a'), (2, NULL)) AS v (n, t) LEFT JOIN LATERAL (SELECT v.n * 2) AS l (m) ON v.n > 1`,
    `SELECT * FROM (VALUES (1)) AS a (x) JOIN (VALUES (1)) AS b (x) USING (x) AS u CROSS JOIN (VALUES (2)) AS c (y) NATURAL FULL JOIN (VALUES (2)) AS d (y)`,
    `SELECT (ARRAY[1, 2, 3])[2], (ARRAY[1, 2, 3])[2:], (ARRAY[[1, 2], [3, 4]])[2][1], ARRAY(SELECT 1 UNION SELECT 2 ORDER BY 1), ROW(1, 'x')::pair, (ROW(1, 'x')::pair)."Y"`,
    `SELECT CASE 1 WHEN 1 THEN 'one' ELSE 'other' END, CASE WHEN NULL THEN 1 END, coalesce(NULL, 2), nullif(1, 1), greatest(1, 3, 2), make_interval(days => 2, hours := 1), concat(VARIADIC ARRAY['a', 'b'])`,
  ]

  test.each(statements)('%s', async (text) => {
    const answer = async (sql: string): Promise<unknown> => {
      const { rows, fields } = await client.query({ text: sql, rowMode: 'array', types: { getTypeParser: () => (value: string | Buffer) => String(value) } })
      return { rows, fields: fields.map((field) => [field.name, field.dataTypeID, field.dataTypeModifier]) }
    }
    const again = await printed(text)
    const first = await answer(text)
    expect(await answer(again)).toEqual(first)
    await client.query('SET standard_conforming_strings = off')
    try {
      expect(await answer(again)).toEqual(first)
    } finally {
      await client.query('RESET standard_conforming_strings')
    }
  })
})
