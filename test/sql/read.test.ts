import { afterAll, describe, expect, test } from 'vitest'
import { Refusal } from '../../src/base/refusal.ts'
import { createParser } from '../../src/sql/parser.ts'
import type { ReadStatement } from '../../src/sql/parser.ts'
import type { Json, RawFields } from '../../src/sql/raw.ts'
import { isFields, placeFields } from '../../src/sql/raw.ts'
import { readStatement } from '../../src/sql/read.ts'
import type { Expr, Statement } from '../../src/sql/tree.ts'
import { corpus } from './corpus.ts'

const parser = createParser()
afterAll(() => parser.close())

async function raw(text: string): Promise<RawFields> {
  const outcome = await parser.parse(text)
  const tree = outcome.kind === 'parsed' ? outcome.statements[0]?.tree : undefined
  if (tree === undefined) throw new Error(`not one statement: ${text}`)
  return tree
}

async function first(text: string): Promise<ReadStatement> {
  const outcome = await parser.readText(text)
  const statement = outcome.kind === 'read' ? outcome.statements[0] : undefined
  if (statement === undefined) throw new Error(`not one statement: ${text}`)
  return statement
}

async function expr(text: string): Promise<Expr> {
  const { statement } = await first(`SELECT ${text}`)
  const body = statement.kind === 'query' ? statement.query.body : undefined
  const value = body?.kind === 'select' ? body.targets[0]?.value : undefined
  if (value === undefined) throw new Error(`not one expression: ${text}`)
  return value
}

/** Every copy of `tree` in which one object has one more field. */
function* grown(tree: Json): Generator<Json> {
  if (Array.isArray(tree)) {
    for (const [index, item] of tree.entries()) for (const other of grown(item as Json)) yield tree.with(index, other)
  } else if (isFields(tree)) {
    yield { ...tree, novelty: 1 }
    for (const [name, item] of Object.entries(tree)) for (const other of grown(item)) yield { ...tree, [name]: other }
  }
}

/** Every copy of `tree` in which one text or number that says something is another. */
function* altered(tree: Json): Generator<Json> {
  if (Array.isArray(tree)) {
    for (const [index, item] of tree.entries()) for (const other of altered(item as Json)) yield tree.with(index, other)
  } else if (isFields(tree)) {
    for (const [name, item] of Object.entries(tree)) {
      if (placeFields.has(name)) continue
      if (typeof item === 'boolean') yield { ...tree, [name]: !item }
      else if (typeof item === 'number') yield { ...tree, [name]: item + 1 }
      else if (typeof item === 'string') yield { ...tree, [name]: `${item}_` }
      else for (const other of altered(item)) yield { ...tree, [name]: other }
    }
  }
}

function attempt(tree: RawFields): Statement | 'refused' {
  try {
    return readStatement(tree, 0)
  } catch (error) {
    if (error instanceof Refusal && error.code === 'text.unreadable') return 'refused'
    throw error
  }
}

describe('every field of every node is read or the statement refused', () => {
  const texts = Object.values(corpus)
    .flat()
    .filter((_, index) => index % 3 === 0)

  test.each(texts)('a field nobody knows is refused wherever it stands: %s', async (text) => {
    const tree = await raw(text)
    const before = attempt(tree)
    expect(before).not.toBe('refused')
    for (const other of grown(tree)) {
      const after = attempt(other as RawFields)
      // A statement that is not read at all may grow as it likes.
      if (typeof after === 'object' && after.kind !== 'other') expect.fail(`unseen field in ${JSON.stringify(other)}`)
    }
  })

  test.each(texts)('a changed field changes what is read, or is refused: %s', async (text) => {
    const tree = await raw(text)
    const before = JSON.stringify(attempt(tree))
    for (const other of altered(tree)) {
      if (JSON.stringify(attempt(other as RawFields)) === before) expect.fail(`the same is read from ${JSON.stringify(other)}`)
    }
  })
})

describe('what cannot be read is refused in words of SQL, with its place', () => {
  const unreadable: readonly (readonly [text: string, what: string, at: string])[] = [
    ['SELECT a FROM t FOR UPDATE', 'FOR UPDATE', 'SELECT'],
    ['SELECT a FROM (SELECT 1 FROM t FOR SHARE) s', 'FOR UPDATE', ''],
    ['SELECT a FROM t TABLESAMPLE system (10)', 'TABLESAMPLE', 'system'],
    ['SELECT JSON_OBJECT(a: 1)', 'JSON_OBJECT', 'JSON_OBJECT'],
    ['SELECT a, JSON_ARRAY(1)', 'JSON_ARRAY', 'JSON_ARRAY'],
    ['SELECT a IS JSON', 'IS JSON', ''],
    ['SELECT JSON_OBJECTAGG(a: b)', 'JSON_OBJECTAGG', ''],
    [`SELECT JSON_VALUE(a, '$.x')`, 'JSON_QUERY, JSON_VALUE or JSON_EXISTS', 'JSON_VALUE'],
    [`SELECT * FROM JSON_TABLE(a, '$' COLUMNS (x int)) j`, 'JSON_TABLE', 'JSON_TABLE'],
    [`SELECT * FROM XMLTABLE('/a' PASSING b COLUMNS x int)`, 'XMLTABLE', 'XMLTABLE'],
    ['SELECT xmlelement(name a)', 'XML expression', 'xmlelement'],
    [`SELECT xmlexists('a' PASSING b)`, 'function call', 'xmlexists'],
    ['SELECT xmlserialize(CONTENT a AS text)', 'XMLSERIALIZE', 'xmlserialize'],
    ['SELECT a IS DOCUMENT', 'XML expression', ''],
    ['WITH RECURSIVE a (x) AS (SELECT 1 UNION SELECT x FROM a) SEARCH DEPTH FIRST BY x SET s SELECT 1', 'SEARCH', 'a (x)'],
    ['WITH RECURSIVE a (x) AS (SELECT 1 UNION SELECT x FROM a) CYCLE x SET c USING p SELECT 1', 'CYCLE', 'a (x)'],
    ['WITH a AS (INSERT INTO t VALUES (1) RETURNING *) SELECT 1', 'data-modifying WITH', 'a AS'],
    ['SELECT (SELECT 1 INTO t)', 'SELECT INTO', ''],
    ['INSERT INTO t SELECT 1 ON CONFLICT DO NOTHING', 'ON CONFLICT', ''],
    ['INSERT INTO t SELECT 1 RETURNING *', 'RETURNING', ''],
    ['INSERT INTO t OVERRIDING SYSTEM VALUE SELECT 1', 'OVERRIDING', ''],
    ['WITH a AS (SELECT 1) INSERT INTO t SELECT * FROM a', 'WITH before INSERT', ''],
    ['INSERT INTO t (a.b) SELECT 1', 'column list', 'a.b'],
    ['CREATE VIEW v AS SELECT 1 WITH CHECK OPTION', 'WITH CHECK OPTION', ''],
    ['CREATE VIEW v WITH (x = local) AS SELECT 1', 'type name', ''],
    ['CREATE TABLE t USING heap AS SELECT 1', 'USING after CREATE TABLE', ''],
    ['CREATE TABLE t WITH (fillfactor = 10) AS SELECT 1', 'WITH after CREATE TABLE', ''],
    ['CREATE TABLE t TABLESPACE x AS SELECT 1', 'TABLESPACE', ''],
    ['COPY (SELECT 1) TO STDOUT (FORCE_QUOTE (a))', 'SQL', ''],
    ['SELECT * FROM f() AS (a text COLLATE "C")', 'COLLATE in a column definition list', 'a text'],
  ]
  test.each(unreadable)('%s', async (text, what, at) => {
    const { statement, refusal } = await first(text)
    expect(statement.kind).toBe('other')
    expect(refusal).toMatchObject({ code: 'text.unreadable', facts: { what } })
    if (at !== '') expect(refusal?.at).toBe(text.indexOf(at))
  })

  test('no refusal shows a name of the parser', async () => {
    for (const [text] of unreadable) expect((await first(text)).refusal?.facts['what']).not.toMatch(/Stmt|Expr|[a-z][A-Z]|_[A-Z]?[a-z]/)
  })
})

describe('statements that are not ours to read', () => {
  const others: readonly (readonly [text: string, tag: string])[] = [
    ['EXECUTE p (1)', 'ExecuteStmt'],
    ['DEALLOCATE p', 'DeallocateStmt'],
    ['BEGIN', 'TransactionStmt'],
    ['SET x = 1', 'VariableSetStmt'],
    ['LOCK TABLE t', 'LockStmt'],
    ['UPDATE t SET a = 1', 'UpdateStmt'],
    ['DELETE FROM t', 'DeleteStmt'],
    ['MERGE INTO a USING b ON true WHEN MATCHED THEN DO NOTHING', 'MergeStmt'],
    ['COPY t TO STDOUT', 'CopyStmt'],
    ['COPY t FROM STDIN', 'CopyStmt'],
    [`COPY (SELECT 1) TO '/tmp/x'`, 'CopyStmt'],
    [`COPY (SELECT 1) TO PROGRAM 'cat'`, 'CopyStmt'],
    ['COPY (DELETE FROM t RETURNING *) TO STDOUT', 'CopyStmt'],
    ['CREATE MATERIALIZED VIEW v AS SELECT 1', 'CreateTableAsStmt'],
    ['CREATE TABLE t AS EXECUTE p', 'CreateTableAsStmt'],
    ['CREATE TABLE t (a int)', 'CreateStmt'],
    ['INSERT INTO t DEFAULT VALUES', 'InsertStmt'],
    ['PREPARE p AS DELETE FROM t', 'PrepareStmt'],
    ['EXPLAIN EXECUTE p', 'ExplainStmt'],
    ['EXPLAIN UPDATE t SET a = 1', 'ExplainStmt'],
    ['FETCH ALL FROM c', 'FetchStmt'],
    ['CLOSE c', 'ClosePortalStmt'],
    [`DO 'BEGIN END'`, 'DoStmt'],
    ['SHOW all', 'VariableShowStmt'],
    ['ANALYZE t', 'VacuumStmt'],
    ['CALL f(1)', 'CallStmt'],
    ['REFRESH MATERIALIZED VIEW v', 'RefreshMatViewStmt'],
  ]
  test.each(others)('%s', async (text, tag) => {
    expect(await first(text)).toMatchObject({ statement: { kind: 'other', tag }, refusal: null })
  })
})

describe('what the parser leaves out or folds', () => {
  test('zero and the empty text come back as themselves', async () => {
    expect(await expr('0')).toMatchObject({ kind: 'constant', constant: { kind: 'integer', value: '0' } })
    expect(await expr(`''`)).toMatchObject({ kind: 'constant', constant: { kind: 'string', value: '' } })
    expect(await expr(`b''`)).toMatchObject({ kind: 'constant', constant: { kind: 'bits', value: 'b' } })
    expect(await expr('false')).toMatchObject({ kind: 'constant', constant: { kind: 'boolean', value: false } })
  })

  test('a negative constant is a sign before a constant', async () => {
    for (const [text, kind, value] of [
      ['-1', 'integer', '1'],
      ['- 1.50', 'decimal', '1.50'],
      ['-2147483648', 'decimal', '2147483648'],
    ] as const) {
      expect(await expr(text)).toMatchObject({ kind: 'operator', name: ['-'], left: null, right: { kind: 'constant', constant: { kind, value } } })
    }
    expect(await expr('- - 1')).toMatchObject({ kind: 'constant', constant: { kind: 'integer', value: '1' } })
  })

  test('numbers keep the text they were typed in', async () => {
    for (const text of ['1.50', '1e3', '99999999999999999999', '.5', '5.', '1_000.5']) {
      expect(await expr(text)).toMatchObject({ constant: { kind: 'decimal', value: text } })
    }
  })

  test('plain DISTINCT, DISTINCT ON and none are three things', async () => {
    const distinct = async (text: string): Promise<number | null | undefined> => {
      const { statement } = await first(text)
      const body = statement.kind === 'query' ? statement.query.body : undefined
      return body?.kind === 'select' ? (body.distinct === null ? null : body.distinct.length) : undefined
    }
    expect(await distinct('SELECT a')).toBeNull()
    expect(await distinct('SELECT DISTINCT a')).toBe(0)
    expect(await distinct('SELECT DISTINCT ON (a, b) a')).toBe(2)
  })

  test('OVER w means the window, OVER (w) a copy of it', async () => {
    expect(await expr('f() OVER w')).toMatchObject({ over: { name: 'w', refers: '' } })
    expect(await expr('f() OVER (w)')).toMatchObject({ over: { name: '', refers: 'w' } })
  })

  test('precedence is the grammar’s', async () => {
    expect(await expr('a OR b AND c')).toMatchObject({ kind: 'logic', word: 'or', args: [{}, { kind: 'logic', word: 'and' }] })
    expect(await expr('NOT a = b')).toMatchObject({ kind: 'not', arg: { kind: 'operator', name: ['='] } })
    expect(await expr('- a ^ b')).toMatchObject({ kind: 'operator', name: ['^'], left: { kind: 'operator', name: ['-'], left: null } })
    expect(await expr('- a::int')).toMatchObject({ kind: 'operator', name: ['-'], right: { kind: 'cast' } })
    expect(await expr('a || b AT TIME ZONE c')).toMatchObject({ kind: 'operator', name: ['||'], right: { kind: 'call', syntax: 'sql' } })
    expect(await expr('a = b IS NULL')).toMatchObject({ kind: 'is-null', arg: { kind: 'operator' } })
  })

  test('places are byte offsets', async () => {
    const text = `SELECT 'é', count(a) FROM t JOIN (SELECT x FROM u) s ON true`
    const { statement } = await first(text)
    const bytes = Buffer.from(text)
    const select = statement.kind === 'query' && statement.query.body.kind === 'select' ? statement.query.body : undefined
    expect(select?.targets[1]?.value.at).toBe(bytes.indexOf('count'))
    const join = select?.from[0]
    expect(join?.at).toBe(bytes.indexOf('t JOIN'))
    expect(join?.kind === 'join' && join.right.at).toBe(bytes.indexOf('x FROM'))
  })
})
