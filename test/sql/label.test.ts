import { Client } from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { createParser } from '../../src/sql/parser.ts'
import { labelOf } from '../../src/sql/label.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'

/** Targets over `FROM label_row AS r`, a row with columns a int, b text, t timestamptz, l int[], p label_pair. */
const targets = [
  `a`,
  `r.a`,
  `a + 1`,
  `- a`,
  `1`,
  `'x'`,
  `null`,
  `true`,
  `a AS named`,
  `a "Named"`,
  `a::text`,
  `1::int`,
  `1::int::text`,
  `'1'::pg_catalog.numeric(5, 2)`,
  `(a + 1)::bigint`,
  `int '1'`,
  `interval '1 day'`,
  `'{}'::int[]`,
  `CAST(a AS text)`,
  `(a::text)::int`,
  `count(*)`,
  `pg_catalog.lower(b)`,
  `count(*) FILTER (WHERE a > 1)`,
  `sum(a) OVER ()`,
  `count(*)::int`,
  `CASE WHEN a > 1 THEN b END`,
  `CASE WHEN a > 1 THEN 'x' ELSE b END`,
  `CASE WHEN a > 1 THEN 'x' ELSE 'y' END`,
  `CASE WHEN a > 1 THEN 1 ELSE 2::int END`,
  `(CASE WHEN a > 1 THEN 1 END)::text`,
  `CASE WHEN a > 1 THEN 'x' ELSE lower(b) END`,
  `coalesce(a, 1)`,
  `nullif(a, 1)`,
  `greatest(a, 1)`,
  `least(a, 1)`,
  `grouping(a)`,
  `EXISTS (SELECT 1)`,
  `NOT EXISTS (SELECT 1)`,
  `ARRAY(SELECT 1)`,
  `ARRAY[1]`,
  `ROW(1, 2)`,
  `(1, 2)`,
  `(SELECT 1)`,
  `(SELECT a)`,
  `(SELECT 1 AS inner_name)`,
  `(SELECT 1)::text`,
  `(SELECT 1 UNION SELECT 2 LIMIT 1)`,
  `(VALUES (1))`,
  `(SELECT max(x) FROM generate_series(1, 2) AS x)`,
  `l[1]`,
  `l[1:2]`,
  `(p).x`,
  `(ARRAY[1])[1]`,
  `(r.p).y`,
  `(CASE WHEN true THEN l END)[1]`,
  `b COLLATE "C"`,
  `(b || 'x') COLLATE "C"`,
  `EXTRACT(year FROM t)`,
  `t AT TIME ZONE 'UTC'`,
  `SUBSTRING(b FROM 1)`,
  `TRIM(b)`,
  `TRIM(LEADING 'x' FROM b)`,
  `POSITION('a' IN b)`,
  `OVERLAY(b PLACING 'x' FROM 1)`,
  `COLLATION FOR (b)`,
  `current_date`,
  `current_timestamp(3)`,
  `localtime`,
  `localtimestamp`,
  `current_time`,
  `current_user`,
  `user`,
  `session_user`,
  `current_role`,
  `current_catalog`,
  `current_schema`,
  `now()`,
  `a IS NULL`,
  `a IN (1)`,
  `a BETWEEN 1 AND 2`,
  `b LIKE 'x'`,
  `a = ANY (l)`,
  `a = 1 AND true`,
  `NOT true`,
  `a IS DISTINCT FROM 1`,
  `a IN (SELECT 1)`,
  `b IS NORMALIZED`,
  `NORMALIZE(b)`,
  `a > 1 IS TRUE`,
]

describe('an unlabelled target is named as PostgreSQL names it', () => {
  const parser = createParser()
  let client: Client
  let server: TestServer
  beforeAll(async () => {
    server = await testServer()
    client = new Client({ connectionString: await server.createDatabase('labels') })
    await client.connect()
    await client.query(`CREATE TYPE label_pair AS (x int, y int)`)
    await client.query(`CREATE TABLE label_row (a int, b text, t timestamptz, l int[], p label_pair)`)
  }, 60_000)
  afterAll(async () => {
    await client.end()
    await server.stop()
    await parser.close()
  })

  test.each(targets)('%s', async (target) => {
    const grouped = /count\(|grouping\(/.test(target) ? 'GROUP BY a' : ''
    const text = `SELECT ${target} FROM label_row AS r ${grouped} LIMIT 0`
    const outcome = await parser.readText(text)
    const statement = outcome.kind === 'read' ? outcome.statements[0]?.statement : undefined
    const body = statement?.kind === 'query' ? statement.query.body : undefined
    const first = body?.kind === 'select' ? body.targets[0] : undefined
    const { fields } = await client.query(text)
    expect(first && labelOf(first)).toBe(fields[0]?.name)
  })
})
