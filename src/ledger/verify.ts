import type { KeyObject } from 'node:crypto'
import { answerMac, genesisMac, headSeal, rowMac } from './chain.ts'
import type { Row, Run } from './connections.ts'
import { text } from './rows.ts'

/** Whether the ledger is as it was written. `seq` is the first charge concerned, '' where it is no charge. */
export type Verdict = { readonly kind: 'whole'; readonly charges: number } | { readonly kind: 'broken'; readonly seq: string; readonly reason: string }

interface Sums {
  readonly period: string
  readonly epsilon: bigint | null
  readonly rho: bigint
  readonly delta: bigint
  readonly rhoEver: bigint
  readonly deltaEver: bigint
}

const batch = 2_000

/** Walks the chain in one snapshot: each row's mac and predecessor, the end, the accounts' totals against the rows, the stored answers. Names the first fault. */
export async function verifyChain(run: Run, key: KeyObject): Promise<Verdict> {
  await run('begin isolation level repeatable read read only')
  try {
    const sums = new Map<string, Sums>()
    let seq = 0n
    let previousMac = genesisMac
    for (let rows = await readRows(run, seq); rows.length > 0; rows = await readRows(run, seq)) {
      for (const row of rows) {
        const fault = faultOf(key, row, seq, previousMac)
        if (fault !== null) return fault
        seq += 1n
        previousMac = text(row[10])
        addRow(sums, row)
      }
    }
    const fault = (await faultOfHead(run, key, seq.toString(), previousMac)) ?? (await faultOfAccounts(run, sums)) ?? (await faultOfAnswers(run, key))
    return fault ?? { kind: 'whole', charges: Number(seq) }
  } finally {
    await run('rollback')
  }
}

async function readRows(run: Run, after: bigint): Promise<readonly Row[]> {
  const { rows } = await run(
    `select seq, id, to_char(at at time zone 'UTC', 'YYYY-MM-DD"T"HH24:MI:SS.US"Z"'), to_json(accounts), to_json(periods), epsilon, rho, delta, note,
            encode(previous_mac, 'hex'), encode(mac, 'hex')
       from ledger.charges where seq > $1 order by seq limit $2`,
    [after.toString(), batch],
  )
  return rows
}

function faultOf(key: KeyObject, row: Row, before: bigint, expectedMac: string): Verdict | null {
  const [seq, id, at, accounts, periods, epsilon, rho, delta, note, previousMac, mac] = row
  const due = (before + 1n).toString()
  if (seq !== due) return broken(due, `charge ${due} is missing: the next one is ${seq}`)
  const made = rowMac(key, {
    seq: due,
    id: text(id),
    at: text(at),
    accounts: JSON.parse(text(accounts)) as readonly string[],
    periods: JSON.parse(text(periods)) as readonly string[],
    epsilon: epsilon ?? null,
    rho: text(rho),
    delta: text(delta),
    note: JSON.parse(text(note)),
    previousMac: text(previousMac),
  })
  if (made !== mac) return broken(due, `charge ${due} was edited`)
  if (previousMac !== expectedMac) return broken(due, `charge ${due} does not follow the one before it: rows were taken out or put in its place`)
  return null
}

async function faultOfHead(run: Run, key: KeyObject, seq: string, lastMac: string): Promise<Verdict | null> {
  const { rows } = await run(`select seq, encode(mac, 'hex'), encode(seal, 'hex') from ledger.head`)
  const [headSeq, headMac, seal] = rows[0] ?? []
  if (headSeq === undefined) return broken('', 'the head of the chain is missing')
  if (seal !== headSeal(key, text(headSeq), text(headMac))) return broken(seq, `the end of the chain after charge ${seq} was edited`)
  const next = (BigInt(seq) + 1n).toString()
  if (headSeq !== seq || headMac !== lastMac) return broken(next, `charge ${next} is missing: the chain went on to ${headSeq}`)
  return null
}

function addRow(sums: Map<string, Sums>, row: Row): void {
  const accounts = JSON.parse(text(row[3])) as readonly string[]
  const periods = JSON.parse(text(row[4])) as readonly string[]
  const [epsilon, rho, delta] = [row[5] ?? null, BigInt(text(row[6])), BigInt(text(row[7]))]
  for (const [place, account] of accounts.entries()) {
    const period = periods[place] ?? ''
    const before = sums.get(account) ?? { period, epsilon: 0n, rho: 0n, delta: 0n, rhoEver: 0n, deltaEver: 0n }
    const inPeriod = before.period === period ? before : { epsilon: 0n, rho: 0n, delta: 0n }
    sums.set(account, {
      period,
      epsilon: epsilon === null || inPeriod.epsilon === null ? null : inPeriod.epsilon + BigInt(epsilon),
      rho: inPeriod.rho + rho,
      delta: inPeriod.delta + delta,
      rhoEver: before.rhoEver + rho,
      deltaEver: before.deltaEver + delta,
    })
  }
}

/** A period's spending may be above its rows' sum (a change of renewal carries earlier rows in), never below. */
async function faultOfAccounts(run: Run, sums: ReadonlyMap<string, Sums>): Promise<Verdict | null> {
  const { rows } = await run('select id, period, epsilon_spent, rho_spent, delta_spent, rho_ever, delta_ever from ledger.accounts order by id')
  const kept = new Map(rows.map((row) => [text(row[0]), row]))
  for (const account of kept.keys())
    if (!sums.has(account)) return broken('', `account ${account} has no charge: it was put in by hand, or its charges are missing`)
  for (const [account, sum] of sums) {
    const [, period, epsilon, rho, delta, rhoEver, deltaEver] = kept.get(account) ?? []
    if (period === undefined) return broken('', `account ${account} is missing`)
    const lowered =
      BigInt(text(rho)) < sum.rho || BigInt(text(delta)) < sum.delta || (epsilon !== null && (sum.epsilon === null || BigInt(text(epsilon)) < sum.epsilon))
    const differs = period !== sum.period || BigInt(text(rhoEver)) !== sum.rhoEver || BigInt(text(deltaEver)) !== sum.deltaEver
    if (lowered || differs) return broken('', `account ${account} was edited: it does not agree with its charges`)
  }
  return null
}

async function faultOfAnswers(run: Run, key: KeyObject): Promise<Verdict | null> {
  for (let after = '0'; ;) {
    const { rows } = await run(
      `select c.seq, a.id, a.answer, encode(a.mac, 'hex') from ledger.answers a join ledger.charges c using (id) where c.seq > $1 order by c.seq limit 200`,
      [after],
    )
    for (const [seq, id, answer, mac] of rows) {
      after = text(seq)
      if (mac !== answerMac(key, text(id), text(answer))) return broken(after, `the stored answer of charge ${after} was edited`)
    }
    if (rows.length === 0) return null
  }
}

function broken(seq: string, reason: string): Verdict {
  return { kind: 'broken', seq, reason }
}
