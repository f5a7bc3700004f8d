/** Prints what a test report of vitest (JSON) comes to. A file that could not be run counts as one failure; no report at all is one as well. */
import { readFileSync } from 'node:fs'

let passed = 0
let failed = 0
try {
  const report = JSON.parse(readFileSync(process.argv[2], 'utf8'))
  passed = report.numPassedTests
  const unrun = report.testResults.filter(({ status, assertionResults }) => status === 'failed' && !assertionResults.some((each) => each.status === 'failed'))
  failed = report.numFailedTests + unrun.length
  if (passed + failed === 0) failed = 1
} catch {
  failed = 1
}
console.log(`${passed} passed, ${failed} failed`)
process.exitCode = failed === 0 ? 0 : 1
