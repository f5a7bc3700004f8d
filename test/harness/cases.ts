/** How many generated cases to try: `ordinary` in a plain test run, as many as asked for in `npm run fuzz`. */
export function caseCount(ordinary: number): number {
  const asked = process.env['HEDGEROW_TEST_CASES'] ?? ''
  return /^[1-9]\d{0,8}$/.test(asked) ? Number(asked) : ordinary
}
