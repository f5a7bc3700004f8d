import type { KeyObject } from 'node:crypto'
import type { Log } from '../base/ports.ts'
import { genesisMac, headSeal } from './chain.ts'
import type { Run } from './connections.ts'
import { text } from './rows.ts'
import { steps } from './schema.ts'

/** Any number that nothing else in the database locks. */
const lockNumber = '7209418365102114'

/** Why the ledger cannot be used as it is; the message is for the operator. */
export class LedgerUnfit extends Error {
  override readonly name = 'LedgerUnfit'
}

/** Brings the schema up to the program's step, under a lock; a LedgerUnfit where the schema is a later program's or the chain another key's. */
export async function migrate(run: Run, key: KeyObject): Promise<void> {
  await run('begin isolation level read committed read write')
  await run('select pg_catalog.pg_advisory_xact_lock($1)', [lockNumber])
  await run('create schema if not exists ledger')
  await run('create table if not exists ledger.version (step int primary key, made_at timestamptz not null default now())')
  const { rows } = await run('select coalesce(max(step), 0) from ledger.version')
  const reached = parseInt(text(rows[0]?.[0]), 10)
  if (reached > steps.length) {
    throw new LedgerUnfit(`the ledger's schema is at step ${reached} and this program knows ${steps.length}: start the version that made it, or a later one`)
  }
  for (const [index, step] of steps.entries()) {
    if (index < reached) continue
    await run(step)
    await run('insert into ledger.version (step) values ($1)', [index + 1])
  }
  const beginning = ['0', `\\x${genesisMac}`, `\\x${headSeal(key, '0', genesisMac)}`]
  await run('insert into ledger.head (seq, mac, seal) select $1, $2, $3 where not exists (select from ledger.charges) on conflict do nothing', beginning)
  await run('commit')
  await holdKey(run, key)
}

async function holdKey(run: Run, key: KeyObject): Promise<void> {
  const { rows } = await run(`select seq, encode(mac, 'hex'), encode(seal, 'hex') from ledger.head`)
  const [seq, mac, seal] = rows[0] ?? []
  if (text(seal ?? '') !== headSeal(key, text(seq ?? ''), text(mac ?? ''))) {
    throw new LedgerUnfit(
      'the end of the ledger is not sealed with this key: give the key it was written with; if this is that key, the ledger was changed by hand',
    )
  }
}

/** INVARIANT DEBITED needs a server that keeps what it said it kept. Complaints are LedgerUnfit, or warnings where `allowUnsafe`. */
export async function holdDurable(run: Run, allowUnsafe: boolean, log: Log): Promise<void> {
  const { rows } = await run(`select name, setting from pg_catalog.pg_settings where name in ('fsync', 'full_page_writes', 'synchronous_commit') order by name`)
  const off = rows.filter(([, setting]) => setting === 'off' || setting === 'local').map(([name]) => text(name))
  if (off.length === 0) return
  const settings = off.join(', ')
  if (!allowUnsafe) {
    throw new LedgerUnfit(
      `the ledger's server has ${settings} off, so a crash could forget a debit whose answer was given: set ${settings} = on, or keep the ledger on another server`,
    )
  }
  log('warn', 'ledger is unsafe: a crash can forget debits; for trials only', { off: settings })
}
