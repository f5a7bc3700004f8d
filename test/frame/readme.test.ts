import { readFileSync } from 'node:fs'
import type pg from 'pg'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { refusals } from '../../src/base/refusals.ts'
import { forms } from '../../src/catalog/functions/forms.ts'
import { fieldRanges, truncUnits } from '../../src/catalog/functions/times.ts'
import { loadFerries } from '../../src/demo/load-ferries.ts'
import { sessionSettings } from '../../src/lobby/pull-functions.ts'
import { lobbyViews } from '../../src/lobby/views.ts'
import { settingRows } from '../../src/settings.ts'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'

const root = new URL('../../', import.meta.url)
const readme = readFileSync(new URL('README.md', root), 'utf8')

/** The text of one section, from its heading to the next of the same level. */
function section(heading: string): string {
  const [, text] = readme.split(`\n## ${heading}\n`)
  if (text === undefined) throw new Error(`the README has no section ${heading}`)
  return text.split('\n## ')[0] ?? ''
}

/** The rows of a section's tables, cell by cell, without header, rule and the backquotes of code. */
function rowsOf(heading: string, columns: number): readonly (readonly string[])[] {
  const rows = section(heading)
    .split('\n')
    .filter((line) => line.startsWith('|'))
    .map((line) =>
      line
        .slice(1, -1)
        .split(/(?<!\\)\|/)
        .map((cell) => cell.trim().replaceAll('\\|', '|')),
    )
  return rows.filter((cells, i) => cells.length === columns && !/^-+$/.test(cells[0] ?? '') && !/^-+$/.test(rows[i + 1]?.[0] ?? ''))
}

function bare(cell: string | undefined): string {
  return (cell ?? '').replace(/^`(.*)`$/s, '$1')
}

describe('the README', () => {
  test('opens with one paragraph that states the job', () => {
    const [title, paragraph, next] = readme.split('\n\n')
    expect(title).toBe('# Hedgerow')
    expect(paragraph).toMatch(/^Hedgerow is a SQL proxy that lets analysts /)
    expect(next).toMatch(/^```/)
  })

  test('has every refusal with its SQLSTATE and its reason, and no other', () => {
    const rows = rowsOf('Refusals', 4).map(([code, sqlstate, , why]) => [bare(code), sqlstate, why])
    expect(rows).toEqual(Object.entries(refusals).map(([code, row]) => [code, row.sqlstate, row.why]))
  })

  test('has every setting of the environment with its default and its meaning, and no other', () => {
    const rows = rowsOf('Operating it', 3).map(([name, byDefault, meaning]) => [bare(name), bare(byDefault), meaning])
    expect(rows).toEqual(settingRows.map((row) => [row.name, row.default ?? '', row.meaning]))
    const named = [...new Set(readme.match(/HEDGEROW_(?!TEST_)\w+/g))]
    expect(named.filter((name) => !settingRows.some((row) => row.name === name))).toEqual([])
  })

  test('has every setting of a session, and no other', () => {
    const names = rowsOf('Settings of a session', 4).map(([name]) => bare(name))
    expect(names.toSorted()).toEqual(sessionSettings.map((name) => `hedgerow.${name}`).toSorted())
  })

  test('has every form that may run on private rows with the proof, and no other', () => {
    const rows = rowsOf('Functions that may run on private rows', 2).map(([sql, total]) => [bare(sql), total])
    expect(rows).toEqual(Object.values(forms).map(({ sql, total }) => [sql, total]))
    const text = section('Functions that may run on private rows')
    expect(text).toContain(`Units of \`date_trunc\`: ${truncUnits.join(', ')}.`)
    expect(text).toContain(`Fields of \`extract\` and \`date_part\`: ${Object.keys(fieldRanges).join(', ')}.`)
  })

  test('has every view, and no other', () => {
    const names = rowsOf('The budget', 2).map(([name]) => bare(name))
    expect(names.toSorted()).toEqual(lobbyViews.map(({ name }) => `hedgerow.${name}`).toSorted())
  })

  test('links to files that are there', () => {
    const links = [...readme.matchAll(/\]\((?!https?:)([^)#]+)\)/g)].map(([, path]) => path ?? '')
    for (const path of links) expect(() => readFileSync(new URL(path, root))).not.toThrow()
    expect(links).toContain('DEVELOPERS.md')
  })
})

interface Statement {
  readonly sql: string
  /** 'answers', 'free', or the code of a refusal. */
  readonly outcome: string
}

/** The statements of the README's SQL blocks: one ends where a line ends in a semicolon; a comment behind it says what becomes of it. */
function statements(info: string): readonly (readonly Statement[])[] {
  return [...readme.matchAll(/^```(.*)\n([\s\S]*?)^```$/gm)]
    .filter(([, language]) => language === info)
    .map(([, , text = '']) =>
      [...text.matchAll(/([\s\S]+?);[ ]*(?:-- (?:refused: ([\w.-]+)|(free)))?\n/g)].map(([, sql = '', code, free]) => ({
        sql: sql.trim(),
        outcome: code ?? free ?? 'answers',
      })),
    )
}

describe('what the README lets SQL do', () => {
  let server: TestHedgerow
  let client: pg.Client

  beforeAll(async () => {
    server = await testHedgerow({
      vault: (url) => loadFerries(url, undefined, 400),
      policy: readFileSync(new URL('policies/ferries.yaml', root), 'utf8'),
      analysts: { ana: '{ epsilon: 400, delta: 1e-3, renews: never }' },
      everyone: '{ epsilon: 1000, delta: 1e-2 }',
    })
    client = await server.connect('ana')
  })
  afterAll(() => server.stop())

  test('the role for the vault can be made, and reads the tables of the policy', async () => {
    const vault = await server.vault()
    const { rows } = await vault.query<{ name: string }>('SELECT current_database() AS name')
    for (const { sql } of statements('sql vault').flat()) await vault.query(sql.replaceAll('ferry_vault', rows[0]?.name ?? ''))
    await vault.query('SET SESSION AUTHORIZATION hedgerow_vault')
    await expect(vault.query('SELECT FROM riders, trips, complaints, piers LIMIT 1')).resolves.toBeDefined()
    await expect(vault.query('DELETE FROM riders')).rejects.toThrow('permission denied')
    await vault.query('RESET SESSION AUTHORIZATION; DROP OWNED BY hedgerow_vault; DROP ROLE hedgerow_vault')
  })

  test.each(statements('sql').flatMap((block, i) => [[`block ${String(i + 1)}: ${block[0]?.sql.slice(0, 70) ?? ''}`, block] as const]))(
    '%s',
    async (_, block) => {
      expect(block.length).toBeGreaterThan(0)
      for (const { sql, outcome } of block) {
        const before = await spent()
        const failure: unknown = await client.query(sql).then(
          () => null,
          (error: unknown) => error,
        )
        if (outcome === 'answers' || outcome === 'free') expect([sql, failure]).toEqual([sql, null])
        else {
          expect(failure, sql).toMatchObject({ code: refusals[outcome as keyof typeof refusals].sqlstate, hint: expect.stringMatching(/./) })
          expect(String(failure), sql).toContain(`[${outcome}]`)
        }
        if (outcome !== 'answers') expect([sql, await spent()]).toEqual([sql, before])
      }
    },
  )

  test('every code of a refusal is one that the README shows or explains', () => {
    const shown = new Set(
      statements('sql')
        .flat()
        .map(({ outcome }) => outcome),
    )
    expect([...shown].filter((outcome) => outcome !== 'answers' && outcome !== 'free' && !Object.hasOwn(refusals, outcome))).toEqual([])
    expect(shown.size).toBeGreaterThan(15)
  })

  async function spent(): Promise<unknown> {
    return (await client.query('SELECT epsilon_spent, rho_spent, delta_spent FROM hedgerow.budget')).rows
  }
})
