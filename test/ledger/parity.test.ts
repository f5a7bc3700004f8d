import fc from 'fast-check'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { Fraction } from '../../src/base/fraction.ts'
import { accepts, addCharge, nothingSpent } from '../../src/budget/accept.ts'
import type { Spent } from '../../src/budget/accept.ts'
import type { AccountCap, Charge } from '../../src/budget/ledger.ts'
import type { OpenLedger } from '../../src/ledger/open.ts'
import { testServer } from '../harness/server.ts'
import type { TestServer } from '../harness/server.ts'
import { note, open } from './fixture.ts'

let server: TestServer
let ledger: OpenLedger

beforeAll(async () => {
  server = await testServer()
  ledger = await open(await server.createDatabase('ledger_parity'))
}, 60_000)

afterAll(async () => {
  await ledger.close()
  await server.stop()
})

/** Few distinct sizes in the meters' own units, so that sums often meet a cap exactly. */
const size = fc.integer({ min: 0, max: 6 })
const charges = fc
  .record({ epsilon: fc.option(size, { freq: 4 }), rho: size, delta: fc.integer({ min: 0, max: 2 }) })
  .map(({ epsilon, rho, delta }): Charge => ({
    epsilon: epsilon === null ? null : Fraction.make(BigInt(epsilon), 10n ** 12n),
    rho: Fraction.make(BigInt(rho), 10n ** 15n),
    delta: Fraction.make(BigInt(delta), 10n ** 20n),
  }))
const caps = fc
  .record({ epsilon: fc.integer({ min: 1, max: 14 }), rho: fc.integer({ min: 0, max: 14 }), pot: fc.integer({ min: 0, max: 4 }) })
  .map(({ epsilon, rho, pot }): AccountCap => ({
    epsilon: Fraction.make(BigInt(epsilon), 10n ** 12n),
    delta: Fraction.parse('1e-6'),
    deltaPot: Fraction.make(BigInt(pot), 10n ** 20n),
    rhoCap: Fraction.make(BigInt(rho), 10n ** 15n),
    renews: 'never',
  }))

test('the rule in SQL decides as the rule in the program does, step by step, with and without a reserve', async () => {
  let run = 0
  const seen = { debited: 0, spent: 0 }
  await fc.assert(
    fc.asyncProperty(caps, fc.array(fc.tuple(charges, fc.option(charges, { freq: 2 })), { minLength: 1, maxLength: 6 }), async (cap, course) => {
      const account = { id: `parity/${run++}`, cap }
      let spent: Spent = nothingSpent
      for (const [charge, reserve] of course) {
        const fits = accepts(cap, reserve === null ? spent : addCharge(spent, reserve), charge)
        const outcome = await ledger.debit([account], charge, reserve, note)
        seen[outcome.kind]++
        expect(outcome.kind).toBe(fits ? 'debited' : 'spent')
        if (fits) spent = addCharge(spent, charge)
        const [balance] = outcome.balances
        expect({ epsilon: balance?.epsilonSpent, rho: balance?.rhoSpent, delta: balance?.deltaSpent }).toEqual(spent)
      }
    }),
    { numRuns: 300 },
  )
  expect(Math.min(seen.debited, seen.spent)).toBeGreaterThan(100)
  expect((await ledger.verify()).kind).toBe('whole')
}, 30_000)
