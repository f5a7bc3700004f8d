import { spawnSync } from 'node:child_process'
import { writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { describe, expect, test } from 'vitest'
import { scratchDirectory } from '../harness/server.ts'

const root = fileURLToPath(new URL('../..', import.meta.url))

function run(script: string, ...args: readonly string[]): { readonly code: number | null; readonly said: string } {
  const { status, stdout, stderr } = spawnSync(process.execPath, [join(root, script), ...args], { cwd: root, encoding: 'utf8' })
  return { code: status, said: `${stdout}${stderr}` }
}

describe('the checks', () => {
  test('find every file in its layer', () => {
    const { code, said } = run('node_modules/dependency-cruiser/bin/dependency-cruise.mjs', 'src', '--config', '.config/layers.mjs')
    expect(said).toMatch(/no dependency violations found \(\d{2,} modules/)
    expect(code).toBe(0)
  })

  test('catch each seeded breach', () => {
    const { code, said } = run('.config/seeded-breaches.mjs')
    expect(said).toMatch(/^(\d{2}) of \1 seeded breaches caught\n$/)
    expect(code).toBe(0)
  }, 120_000)
})

describe('the tally of a test run', () => {
  const passed = { status: 'passed', assertionResults: [{ status: 'passed' }] }
  test.each([
    ['3 passed, 0 failed', 0, { numPassedTests: 3, numFailedTests: 0, testResults: [passed] }],
    [
      '3 passed, 2 failed',
      1,
      { numPassedTests: 3, numFailedTests: 2, testResults: [passed, { status: 'failed', assertionResults: [{ status: 'failed' }, { status: 'failed' }] }] },
    ],
    ['3 passed, 1 failed', 1, { numPassedTests: 3, numFailedTests: 0, testResults: [passed, { status: 'failed', assertionResults: [] }] }],
    ['0 passed, 1 failed', 1, { numPassedTests: 0, numFailedTests: 0, testResults: [] }],
    ['0 passed, 1 failed', 1, 'half a rep'],
  ])('is %s with code %i', (line, code, report) => {
    const scratch = scratchDirectory('hedgerow-tally')
    try {
      const file = join(scratch.path, 'report.json')
      writeFileSync(file, typeof report === 'string' ? report : JSON.stringify(report))
      expect(run('.config/tally.mjs', file)).toEqual({ code, said: `${line}\n` })
    } finally {
      scratch.remove()
    }
  })

  test('without a report is one failure', () => {
    expect(run('.config/tally.mjs', join(root, 'no-such-report.json'))).toEqual({ code: 1, said: '0 passed, 1 failed\n' })
  })
})
