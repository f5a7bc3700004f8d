import { existsSync, readFileSync, readdirSync } from 'node:fs'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { expect, test } from 'vitest'

const root = fileURLToPath(new URL('../../', import.meta.url))
const text = readFileSync(join(root, 'DEVELOPERS.md'), 'utf8')
const manifest = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8')) as {
  readonly dependencies: Readonly<Record<string, string>>
  readonly devDependencies: Readonly<Record<string, string>>
  readonly scripts: Readonly<Record<string, string>>
}

test('DEVELOPERS.md gives the reason of every package, and of no other', () => {
  const [, table = ''] = text.split('## Packages, and why each is there\n')
  const named = [...table.matchAll(/^\| (`.*?`) \|/gm)].flatMap(([, cell = '']) => [...cell.matchAll(/`([^`]+)`/g)].map(([, name = '']) => name))
  expect(named.toSorted()).toEqual([...Object.keys(manifest.dependencies), ...Object.keys(manifest.devDependencies)].toSorted())
})

test('DEVELOPERS.md speaks of files that are there', () => {
  const paths = [...text.matchAll(/`((?:src|test|\.config|\.ci|policies)\/[\w./-]*)`/g)].map(([, path = '']) => path)
  expect(paths.length).toBeGreaterThan(50)
  expect(paths.filter((path) => !existsSync(join(root, path)))).toEqual([])
})

test('DEVELOPERS.md speaks of scripts that are there', () => {
  const scripts = [...text.matchAll(/`npm (?:run )?([\w:]+)/g)].map(([, name = '']) => name)
  expect(scripts.filter((name) => !Object.hasOwn(manifest.scripts, name))).toEqual([])
})

test('every invariant of DEVELOPERS.md is named where it is said to be established', () => {
  const [, section = ''] = text.split('## Invariants\n')
  const rows = [...(section.split('\n## ')[0] ?? '').matchAll(/^\| ([A-Z ]+) \| [^|]+ \| ([^|]+) \| [^|]+ \|$/gm)]
  expect(rows.length).toBeGreaterThan(10)
  for (const [, name = '', established = ''] of rows) {
    const files = [...established.matchAll(/`([^`]+)`/g)].flatMap(([, path = '']) => sources(path))
    expect(
      files.some((file) => readFileSync(file, 'utf8').includes(`INVARIANT ${name}`)),
      name,
    ).toBe(true)
  }
})

function sources(path: string): readonly string[] {
  const full = join(root, path)
  return path.endsWith('/') ? readdirSync(full).map((name) => join(full, name)) : [full]
}
