import { randomBytes } from 'node:crypto'
import type pg from 'pg'
import type { Policies } from '../policy/data-set.ts'
import { endingBlockers } from './blockers.ts'
import { installDataSet, type PullAddress } from './data-set-database.ts'
import { closeDatabases, createDatabases, setDatabaseDefaults } from './databases.ts'
import { underPolicyLock } from './policy-lock.ts'
import { LobbyProblem } from './problem.ts'
import { defaultLimits, endStrayedSessions, installAnalysts, installOwnRoles, knownAnalysts, type AnalystLimits, type RoleOutcome } from './roles.ts'
import { inTransaction, openSession, rowsOf, sqlstateOf, urlOf } from './session.ts'

export interface LobbyOrder {
  /** A superuser, or a role with CREATEROLE and CREATEDB; the database in it is only the place to start from. */
  readonly lobbyUrl: string
  readonly ledgerUrl: string
  /** A role that may read the published tables. */
  readonly vaultUrl: string
  readonly policies: Policies
  /** Where the lobby finds Hedgerow's pull port, seen from the lobby's server. */
  readonly pull: PullAddress
  readonly limits?: AnalystLimits
  /** How long another Hedgerow's load is waited for. */
  readonly lockWaitMs?: number
}

export interface LobbyReport {
  /** Databases that are new. */
  readonly created: readonly string[]
  /** Per data set, its tables (schema.name). */
  readonly tables: ReadonlyMap<string, readonly string[]>
  /** Analysts whose log-in was taken. */
  readonly removed: readonly string[]
  /** One entry for each session that was ended: the role. */
  readonly ended: readonly string[]
  /** What could not be closed or set, each with its remedy. */
  readonly warnings: readonly string[]
}

const lockTimeoutMs = 10_000

/** Brings the lobby up to what the policies say; may be repeated at any time. Throws LobbyProblem where the operator has to do something first. */
export async function installLobby(order: LobbyOrder): Promise<LobbyReport> {
  return underPolicyLock(order.ledgerUrl, order.lockWaitMs ?? 120_000, () => install(order))
}

async function install(order: LobbyOrder): Promise<LobbyReport> {
  const { policies } = order
  const warnings = new Set<string>()
  const ended: string[] = []
  const warn = (text: string): void => void warnings.add(text)
  const noteEnded = (role: string): void => void ended.push(role)
  const main = await openInstaller(order.lobbyUrl)
  try {
    const superuser = await isSuperuser(main)
    await quiet(main)
    await refuseVault(order, main)
    const known = await withWatcher(order.lobbyUrl, main, [], noteEnded, () => installRoles(main, order, superuser, warn, noteEnded))
    const created = await createDatabases(main, [...policies.dataSets.keys()])
    await withWatcher(order.lobbyUrl, main, known.analysts, noteEnded, async () => {
      for (const open of await closeDatabases(main, policies, known.analysts)) warn(open)
      await inTransaction(main, 'BEGIN', () => setDatabaseDefaults(main, policies, superuser, warn))
    })
    const tables = new Map<string, readonly string[]>()
    for (const dataSet of policies.dataSets.values()) tables.set(dataSet.name, await installOne(order, dataSet.name, known, superuser, warn, noteEnded))
    for (const role of await endStrayedSessions(main, known.analysts)) noteEnded(role)
    await refuseOpenDoor(order)
    return { created, tables, removed: known.removed, ended, warnings: [...warnings] }
  } finally {
    await main.end().catch(() => undefined)
  }
}

async function installRoles(
  main: pg.Client,
  order: LobbyOrder,
  superuser: boolean,
  warn: (text: string) => void,
  ended: (role: string) => void,
): Promise<RoleOutcome> {
  await inTransaction(main, 'BEGIN', () => installOwnRoles(main, superuser))
  const known = await knownAnalysts(main, order.policies)
  await withWatcher(order.lobbyUrl, main, known.analysts, ended, () =>
    againIfRaced(() => inTransaction(main, 'BEGIN', () => installAnalysts(main, order.policies, known, order.limits ?? defaultLimits, superuser, warn))),
  )
  return known
}

async function installOne(
  order: LobbyOrder,
  dataSet: string,
  known: RoleOutcome,
  superuser: boolean,
  warn: (text: string) => void,
  ended: (role: string) => void,
): Promise<readonly string[]> {
  const definition = order.policies.dataSets.get(dataSet)
  if (definition === undefined) return []
  const url = urlOf(order.lobbyUrl, dataSet)
  const lobby = await openInstaller(url)
  try {
    await quiet(lobby)
    const vault = await openSession(order.vaultUrl, {
      DateStyle: 'ISO, MDY',
      IntervalStyle: 'postgres',
      TimeZone: 'UTC',
      extra_float_digits: '3',
      client_encoding: 'UTF8',
    })
    try {
      return await withWatcher(url, lobby, known.analysts, ended, () => installDataSet(lobby, vault, definition, order.pull, superuser, warn))
    } finally {
      await vault.end().catch(() => undefined)
    }
  } finally {
    await lobby.end().catch(() => undefined)
  }
}

function openInstaller(url: string): Promise<pg.Client> {
  return openSession(url, {
    search_path: 'pg_catalog',
    lock_timeout: String(lockTimeoutMs),
    statement_timeout: '0',
    client_min_messages: 'error',
    row_security: 'on',
    DateStyle: 'ISO, MDY',
    IntervalStyle: 'postgres',
    TimeZone: 'UTC',
  })
}

/** The pull port's password and the analysts' verifiers stay out of the server's log; a role that may not set this was warned of it. */
async function quiet(client: pg.Client): Promise<void> {
  for (const setting of ["log_statement = 'none'", 'log_min_duration_statement = -1', "log_min_error_statement = 'panic'", 'log_duration = off']) {
    await client.query(`SET ${setting}`).catch((error: unknown) => {
      if (sqlstateOf(error) !== '42501') throw error
    })
  }
}

async function isSuperuser(client: pg.Client): Promise<boolean> {
  const [row] = await rowsOf(client, 'SELECT rolsuper FROM pg_catalog.pg_roles WHERE rolname = current_user')
  return row?.[0] === 't'
}

async function withWatcher<T>(url: string, client: pg.Client, analysts: readonly string[], ended: (role: string) => void, work: () => Promise<T>): Promise<T> {
  if (analysts.length === 0) return work()
  const watcher = await openInstaller(url)
  try {
    return await endingBlockers(watcher, client, analysts, ended, work)
  } finally {
    await watcher.end().catch(() => undefined)
  }
}

/** An analyst who changes the own role at the same instant makes ours fail once ("tuple concurrently updated"). */
async function againIfRaced<T>(work: () => Promise<T>): Promise<T> {
  for (let left = 5; ; left -= 1) {
    try {
      return await work()
    } catch (error) {
      if (left === 0 || sqlstateOf(error) !== 'XX000') throw error
    }
  }
}

/** The lobby's databases carry the data sets' names: on the vault's own server one of them could be the vault. */
async function refuseVault(order: LobbyOrder, main: pg.Client): Promise<void> {
  const identifier = 'SELECT system_identifier::text, pg_catalog.current_database() FROM pg_catalog.pg_control_system()'
  const vault = await openSession(order.vaultUrl)
  try {
    const [theirs] = await rowsOf(vault, identifier)
    const [ours] = await rowsOf(main, identifier)
    if (theirs?.[0] === ours?.[0] && order.policies.dataSets.has(theirs?.[1] ?? '')) {
      throw new LobbyProblem(
        `the vault is the database ${theirs?.[1]} of the lobby's own server, where the lobby of that data set would be`,
        'rename one of them, or use another server for the lobby',
      )
    }
  } finally {
    await vault.end().catch(() => undefined)
  }
}

/** INVARIANT PASSWORD ASKED: a wrong password must not open an analyst's session, or the lobby's pg_hba.conf trusts whoever Hedgerow relays. */
async function refuseOpenDoor(order: LobbyOrder): Promise<void> {
  for (const analyst of order.policies.analysts.values()) {
    const database = [...analyst.data.keys()].find((name) => order.policies.dataSets.has(name))
    if (analyst.login === null || database === undefined) continue
    const url = new URL(urlOf(order.lobbyUrl, database))
    url.username = encodeURIComponent(analyst.name)
    url.password = randomBytes(18).toString('hex')
    try {
      await (await openSession(url.toString())).end()
    } catch {
      return
    }
    throw new LobbyProblem(`the lobby let ${analyst.name} in with a wrong password`, 'its pg_hba.conf must demand scram-sha-256 of every role on this path')
  }
}
