import { createHash } from 'node:crypto'
import type pg from 'pg'
import type { DataSet } from '../policy/data-set.ts'
import { closeFunctions, closeMatching } from './closed-functions.ts'
import { LobbyProblem } from './problem.ts'
import { closeShellTexts, dropRelation, stagePublished, swapPublished } from './published.ts'
import { dblinkFunctions, lobbyFunctions } from './pull-functions.ts'
import { literal, name, qualified } from './quote.ts'
import { inTransaction, rowsOf, sqlstateOf } from './session.ts'
import { commentTexts, planTables, type TablePlan } from './table-plan.ts'
import { installTypes } from './types.ts'
import { readVaultShape } from './vault-shape.ts'
import { lobbyViews, viewText } from './views.ts'

export interface PullAddress {
  readonly host: string
  readonly port: number
  readonly password: string
}

/** What one data set's database gets: all of it in steps that can be repeated, the last of them one transaction. */
export async function installDataSet(
  lobby: pg.Client,
  vault: pg.Client,
  dataSet: DataSet,
  pull: PullAddress,
  superuser: boolean,
  warn: (text: string) => void,
): Promise<readonly string[]> {
  await refuseStrangers(lobby, dataSet)
  const open = await inTransaction(lobby, 'BEGIN', () => closeFunctions(lobby))
  if (open.length > 0)
    warn(
      `functions that analysts should not have are open to them: have a superuser run in ${dataSet.name}: REVOKE EXECUTE ON FUNCTION ${open.join(', ')} FROM PUBLIC`,
    )
  return inTransaction(vault, 'BEGIN ISOLATION LEVEL REPEATABLE READ READ ONLY', async () => {
    const shape = await readVaultShape(vault, dataSet)
    const plans = planTables(dataSet, shape)
    await inTransaction(lobby, 'BEGIN', () => prepare(lobby, dataSet, plans))
    await inTransaction(lobby, 'BEGIN', () => installDblink(lobby, dataSet.name, pull, superuser))
    await inTransaction(lobby, 'BEGIN', () => installTypes(lobby, shape.types))
    const published = plans.filter((plan) => plan.kind === 'published')
    for (const [at, plan] of published.entries()) await stagePublished(vault, lobby, plan, at)
    await inTransaction(lobby, 'BEGIN', async () => {
      await installFunctions(lobby)
      await installTables(lobby, dataSet, plans, published)
      await lobby.query('DROP SCHEMA hedgerow_stage CASCADE')
    })
    return plans.map((plan) => plan.key)
  })
}

/** A database that holds tables of somebody else's is not overwritten: it may be the vault itself. */
async function refuseStrangers(lobby: pg.Client, dataSet: DataSet): Promise<void> {
  const [row] = await rowsOf(
    lobby,
    `SELECT pg_catalog.to_regnamespace('hedgerow_inside') IS NULL AND EXISTS (
       SELECT FROM pg_catalog.pg_class c JOIN pg_catalog.pg_namespace n ON n.oid = c.relnamespace
        WHERE c.relkind IN ('r', 'p', 'v', 'm', 'f') AND n.nspname NOT IN ('pg_catalog', 'information_schema') AND n.nspname !~ '^pg_(toast|temp)')`,
  )
  if (row?.[0] === 't') {
    throw new LobbyProblem(
      `the lobby's server has a database ${dataSet.name} with tables that Hedgerow did not make`,
      'let HEDGEROW_LOBBY_URL name another server, or rename the data set or that database',
    )
  }
}

async function prepare(lobby: pg.Client, dataSet: DataSet, plans: readonly TablePlan[]): Promise<void> {
  const schemas = new Set([dataSet.schema, ...plans.map((plan) => plan.schema)])
  for (const schema of [...schemas, 'hedgerow', 'hedgerow_inside']) await lobby.query(`CREATE SCHEMA IF NOT EXISTS ${name(schema)}`)
  await lobby.query('DROP SCHEMA IF EXISTS hedgerow_stage CASCADE')
  await lobby.query('CREATE SCHEMA hedgerow_stage')
  for (const schema of [...schemas, 'hedgerow', 'hedgerow_inside', 'hedgerow_stage']) {
    await lobby.query(`REVOKE ALL ON SCHEMA ${name(schema)} FROM PUBLIC`)
    await lobby.query(`GRANT USAGE, CREATE ON SCHEMA ${name(schema)} TO hedgerow_owner`)
  }
  for (const schema of [...schemas, 'hedgerow']) await lobby.query(`GRANT USAGE ON SCHEMA ${name(schema)} TO PUBLIC`)
  await lobby.query('REVOKE CREATE ON SCHEMA public FROM PUBLIC')
  await lobby.query('CREATE TABLE IF NOT EXISTS hedgerow_inside.made (key text PRIMARY KEY, kind text NOT NULL, signature text NOT NULL)')
}

/** Only a superuser can install dblink; another role finds it prepared, or learns what to ask for. */
async function installDblink(lobby: pg.Client, database: string, pull: PullAddress, superuser: boolean): Promise<void> {
  const [row] = await rowsOf(
    lobby,
    "SELECT n.nspname FROM pg_catalog.pg_extension e JOIN pg_catalog.pg_namespace n ON n.oid = e.extnamespace WHERE e.extname = 'dblink'",
  )
  try {
    if (row === undefined) await lobby.query('CREATE EXTENSION dblink SCHEMA hedgerow_inside')
    else if (row[0] !== 'hedgerow_inside') await lobby.query('ALTER EXTENSION dblink SET SCHEMA hedgerow_inside')
    await installServer(lobby, pull)
  } catch (error) {
    const code = sqlstateOf(error)
    if (code === '42501') {
      throw new LobbyProblem(
        `the lobby's role may not install dblink in the database ${database}`,
        `have a superuser run there: CREATE EXTENSION dblink SCHEMA hedgerow_inside; GRANT USAGE ON FOREIGN DATA WRAPPER dblink_fdw TO the lobby's role`,
      )
    }
    if (code === '0A000' || code === '58P01') throw new LobbyProblem("the lobby's server has no dblink", 'install the contrib modules of PostgreSQL there')
    throw error
  }
  if (!superuser) return
  await closeMatching(lobby, 'hedgerow_inside', '^dblink')
  await lobby.query(dblinkFunctions.map((signature) => `GRANT EXECUTE ON FUNCTION hedgerow_inside.${signature} TO hedgerow_owner`).join('; '))
}

async function installTables(lobby: pg.Client, dataSet: DataSet, plans: readonly TablePlan[], published: readonly TablePlan[]): Promise<void> {
  const made = new Map(
    (await rowsOf(lobby, "SELECT key, signature FROM hedgerow_inside.made WHERE kind <> 'view'")).map(([key, signature]) => [key ?? '', signature]),
  )
  const kept = new Set(plans.map((plan) => plan.key))
  for (const key of made.keys()) {
    const dot = key.indexOf('.')
    if (!kept.has(key)) await dropRelation(lobby, key.slice(0, dot), key.slice(dot + 1))
  }
  for (const [at, plan] of published.entries()) await swapPublished(lobby, plan, at)
  const fresh = plans.filter((plan) => plan.kind === 'private' && made.get(plan.key) !== plan.signature)
  for (const plan of fresh) {
    await dropRelation(lobby, plan.schema, plan.name)
    await lobby.query(plan.createAs(plan.schema, plan.name))
    for (const index of plan.indexes) await lobby.query(index.createOn(plan.schema, plan.name, index.name))
  }
  for (const plan of fresh) await lobby.query(closeShellTexts(plan).join('; '))
  for (const plan of plans) await grantTable(lobby, plan)
  await addForeignKeys(lobby, plans)
  for (const table of dataSet.tables.values()) await lobby.query(commentTexts(dataSet, table).join('; '))
  await lobby.query("DELETE FROM hedgerow_inside.made WHERE kind <> 'view'")
  for (const plan of plans) await rowsOf(lobby, 'INSERT INTO hedgerow_inside.made VALUES ($1, $2, $3)', [plan.key, plan.kind, plan.signature])
}

/** As their owner, whom a shell lets pass: PostgreSQL looks for rows without a partner. */
async function addForeignKeys(lobby: pg.Client, plans: readonly TablePlan[]): Promise<void> {
  await lobby.query('SET LOCAL ROLE hedgerow_owner')
  for (const plan of plans) {
    const rows = await rowsOf(lobby, "SELECT conname FROM pg_catalog.pg_constraint WHERE conrelid = $1::regclass AND contype = 'f'", [
      qualified(plan.schema, plan.name),
    ])
    const here = new Set(rows.map(([constraint]) => constraint))
    for (const key of plan.foreignKeys) if (!here.has(key.name)) await lobby.query(key.add)
  }
  await lobby.query('RESET ROLE')
}

async function grantTable(lobby: pg.Client, plan: TablePlan): Promise<void> {
  const table = qualified(plan.schema, plan.name)
  await lobby.query(`ALTER TABLE ${table} OWNER TO hedgerow_owner; GRANT SELECT ON ${table} TO PUBLIC`)
}

async function installFunctions(lobby: pg.Client): Promise<void> {
  for (const made of lobbyFunctions) {
    const grant = made.open ? `GRANT EXECUTE ON FUNCTION ${made.signature} TO PUBLIC` : `REVOKE ALL ON FUNCTION ${made.signature} FROM PUBLIC`
    await lobby.query(`${made.text}; ALTER FUNCTION ${made.signature} OWNER TO hedgerow_owner; ${grant}`)
  }
  const made = new Map((await rowsOf(lobby, 'SELECT key, signature FROM hedgerow_inside.made')) as unknown as [string, string][])
  for (const view of lobbyViews) {
    const key = `hedgerow.${view.name}`
    const text = viewText(view)
    const signature = createHash('sha256').update(text).digest('hex')
    // An unchanged view is left alone: an analyst may be reading it.
    if (made.get(key) === signature) continue
    await lobby.query(`DROP VIEW IF EXISTS ${qualified('hedgerow', view.name)} CASCADE`)
    await lobby.query(text)
    await lobby.query(`COMMENT ON VIEW ${qualified('hedgerow', view.name)} IS ${literal(view.comment)}`)
    await lobby.query(`ALTER VIEW ${qualified('hedgerow', view.name)} OWNER TO hedgerow_owner`)
    await lobby.query(`GRANT SELECT ON ${qualified('hedgerow', view.name)} TO PUBLIC`)
    await rowsOf(lobby, 'INSERT INTO hedgerow_inside.made VALUES ($1, $2, $3) ON CONFLICT (key) DO UPDATE SET signature = excluded.signature', [
      key,
      'view',
      signature,
    ])
  }
}

async function installServer(lobby: pg.Client, pull: PullAddress): Promise<void> {
  const options: readonly (readonly [string, string])[] = [
    ['host', pull.host],
    ['port', String(pull.port)],
    ['dbname', 'pull'],
    ['connect_timeout', '5'],
  ]
  const user: readonly (readonly [string, string])[] = [
    ['user', 'hedgerow'],
    ['password', pull.password],
  ]
  const list = (pairs: readonly (readonly [string, string])[], verb: string): string =>
    pairs.map(([key, value]) => `${verb} ${key} ${literal(value)}`).join(', ')
  const found = await rowsOf(lobby, "SELECT FROM pg_catalog.pg_foreign_server WHERE srvname = 'hedgerow_pull'")
  if (found.length > 0) {
    await lobby.query(`ALTER SERVER hedgerow_pull OPTIONS (${list(options, 'SET')})`)
    await lobby.query(`ALTER USER MAPPING FOR hedgerow_owner SERVER hedgerow_pull OPTIONS (${list(user, 'SET')})`)
  } else {
    await lobby.query(`CREATE SERVER hedgerow_pull FOREIGN DATA WRAPPER dblink_fdw OPTIONS (${list(options, '')})`)
    await lobby.query(`CREATE USER MAPPING FOR hedgerow_owner SERVER hedgerow_pull OPTIONS (${list(user, '')})`)
  }
  await lobby.query('REVOKE ALL ON FOREIGN SERVER hedgerow_pull FROM PUBLIC')
  await lobby.query('GRANT USAGE ON FOREIGN SERVER hedgerow_pull TO hedgerow_owner')
}
