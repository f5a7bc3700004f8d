import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { TestHedgerow } from '../harness/hedgerow.ts'
import { ferries } from './ferries.ts'
import { hasTerminal, psql, psqlVersion, typeInto } from './psql.ts'

const where = psqlVersion === null ? ' (skipped: no psql on this machine)' : ''
const terminal = psqlVersion !== null && hasTerminal ? '' : ' (skipped: no psql with a terminal on this machine)'

describe.skipIf(psqlVersion === null)(`psql${where}`, () => {
  let server: TestHedgerow
  beforeAll(async () => {
    server = await ferries()
  })
  afterAll(() => server.stop())

  test('connects with the password, and with a wrong one is told so and nothing else', async () => {
    expect(await psql(server, 'SELECT current_user', { args: ['-At'] })).toMatchObject({ code: 0, out: 'ana\n', err: '' })
    const wrong = await psql(server, 'SELECT 1', { password: 'sextant' })
    expect(wrong.code).toBe(2)
    expect(wrong.err).toContain('FATAL:  password authentication failed for user "ana"')
    const unknown = await psql(server, 'SELECT 1', { user: 'nobody', password: 'sextant' })
    expect(unknown.err).toContain('FATAL:  password authentication failed for user "nobody"')
  })

  test('lists and describes what the policy shows, and no more', async () => {
    const { out, err } = await psql(server, '\\d\n\\dt\n\\dt+\n\\d trips\n\\d+ riders\n\\di\n\\dv hedgerow.*\n\\df hedgerow.*\n\\du\n\\dn\n\\dp\n\\dT\n\\dx\n')
    expect(err).toBe('')
    expect(out).toContain('Table "public.trips"')
    expect(out).toMatch(/ weight +\| numeric\(6,2\) /)
    expect(out).toContain('clamp 1900 to 2020')
    expect(out).toContain('"trips_rider_id_fkey" FOREIGN KEY (rider_id) REFERENCES riders(rider_id)')
    expect(out).toMatch(/ hedgerow +\| budget /)
    expect(out).not.toContain('secret_note')
    expect(out).not.toContain('trip_id')
  })

  test.skipIf(psqlVersion !== null && psqlVersion < 18)(
    `\\l lists databases${psqlVersion !== null && psqlVersion < 18 ? ' (skipped: this psql is older than the server and asks for columns it no longer has)' : ''}`,
    async () => {
      const { out, err } = await psql(server, '\\l\n')
      expect(err).toBe('')
      expect(out).toContain('ferries')
    },
  )

  test('answers a private statement, with a notice of what it spent', async () => {
    const { out, err } = await psql(server, 'SELECT district, count(*) AS riders FROM riders GROUP BY district ORDER BY district;', { args: ['-A'] })
    expect(out).toBe('district|riders\nEastquay|100\nGullhaven|0\nNorthbank|100\nSaltmarsh|100\n(4 rows)\n')
    expect(err).toMatch(/^NOTICE: {2}spent epsilon 1000000000000000000000000000000 \(laplace noise\); .*margin of the noise: count\(\*\) ± 0\n$/)
  })

  test('EXPLAIN shows releases and charge in PostgreSQL’s own column', async () => {
    const { out, err } = await psql(server, 'EXPLAIN SELECT pier, count(*) FROM trips GROUP BY pier;')
    expect(err).toBe('')
    expect(out).toContain('QUERY PLAN')
    expect(out).toMatch(/Release from trips\s/)
    expect(out).toMatch(/Charge: epsilon 10{30}\s/)
  })

  test('a refusal shows the place, the code and a hint that works as it stands', async () => {
    const { out, err } = await psql(server, 'SELECT fare FROM trips WHERE fare > 3;')
    expect(out).toBe('')
    const [message, line, caret, hint] = err.split('\n')
    expect(message).toBe('ERROR:  rows of "trips" are about persons and are not shown [rows.private]')
    expect(line).toBe('LINE 1: SELECT fare FROM trips WHERE fare > 3;')
    expect(caret).toBe(' '.repeat('LINE 1: SELECT fare FROM '.length) + '^')
    const sql = /^HINT: {2}Ask for an aggregate instead: (.+)$/.exec(hint ?? '')?.[1] ?? ''
    expect((await psql(server, `${sql};`)).out).toContain('p0')
  })

  test('what PostgreSQL would complain about, it complains about itself, with its caret', async () => {
    const { err } = await psql(server, 'SELECT count(*) FROM trips WHERE fares = 3;\nSELECT count(*) FORM trips;\n')
    const under = (text: string): string => `${' '.repeat(`LINE 1: ${text}`.length)}^`
    expect(err).toContain(
      `ERROR:  column "fares" does not exist\nLINE 1: SELECT count(*) FROM trips WHERE fares = 3;\n${under('SELECT count(*) FROM trips WHERE ')}\nHINT:  Perhaps you meant to reference the column "trips.fare".`,
    )
    expect(err).toContain(`ERROR:  syntax error at or near "trips"\nLINE 1: SELECT count(*) FORM trips;\n${under('SELECT count(*) FORM ')}`)
  })

  test('\\copy, variables, \\gset, \\gdesc, \\crosstabview and \\gexec work over private statements', async () => {
    const script = `
      \\copy (SELECT pier, count(*), sum(fare) FROM trips GROUP BY pier ORDER BY 1 NULLS LAST) TO STDOUT CSV HEADER
      \\set place Northbank
      SELECT count(*) AS n FROM riders WHERE district = :'place';
      SELECT count(*) AS trips FROM trips \\gset
      \\echo [:trips]
      SELECT day, count(*), avg(fare) AS mean FROM trips GROUP BY day \\gdesc
      SELECT district, concession, count(*) FROM riders GROUP BY 1, 2 ORDER BY 1, 2 \\crosstabview
      SELECT 'SELECT count(*) + 7 AS seven FROM riders WHERE district = ' || quote_literal(d) FROM (VALUES ('Eastquay')) v(d) \\gexec
    `
    const { out, err } = await psql(server, script, { args: ['-A', '-q'] })
    expect(err.replaceAll(/NOTICE: .*\n/g, '')).toBe('')
    expect(out).toContain('pier,count,sum\np0,750,2247\np1,750,2248\np2,750,2249\np3,750,2250\np9,0,0\n,0,0\n')
    expect(out).toContain('n\n100\n')
    expect(out).toContain('[3000]')
    expect(out).toContain('Column|Type\nday|date\ncount|bigint\nmean|numeric\n')
    expect(out).toContain('district|f|t|\n')
    expect(out).toContain('seven\n107\n')
  })

  test('-1 rolls a script back at a refusal, and ON_ERROR_STOP ends with its exit code', async () => {
    const { code, err } = await psql(server, 'CREATE TEMP TABLE kept AS SELECT count(*) FROM trips; SELECT * FROM riders; SELECT 1;', {
      args: ['-1', '-v', 'ON_ERROR_STOP=1'],
    })
    expect(code).toBe(3)
    expect(err).toContain('[rows.private]')
  })

  test.skipIf(psqlVersion !== null && psqlVersion < 16)(
    `\\bind gives parameters${psqlVersion !== null && psqlVersion < 16 ? ' (skipped: this psql has no \\bind)' : ''}`,
    async () => {
      const { out } = await psql(server, `SELECT count(*) FROM riders WHERE district = $1 \\bind Eastquay \\g`, { args: ['-At'] })
      expect(out).toBe('100\n')
    },
  )

  test.skipIf(terminal !== '')(`completes table and column names${terminal}`, async () => {
    const screen = await typeInto(server, [
      ['SELECT count(*) FROM tri\t', /FROM trips/],
      ['WHERE far\t', /fare/],
      ['> 3;\n', /1[0-9]{3}\s/],
      ['SELECT count(*) FROM r\t', /riders/],
      [';\n', /300\s/],
      ['\\d tr\t', /trips/],
      ['\n', /fare\s+\| integer/],
    ])
    expect(screen).not.toContain('ERROR')
  })
})
