import type pg from 'pg'
import { unreachable } from '../base/check.ts'
import { LobbyProblem } from './problem.ts'
import { literal, name, qualified } from './quote.ts'
import { rowsOf } from './session.ts'
import type { TypeShape } from './vault-shape.ts'

/**
 * Makes the vault's own types and brings them up to date. A type that changed otherwise than by new labels moves out of the way, into hedgerow_stage;
 * the shells are then made anew.
 */
export async function installTypes(client: pg.Client, types: readonly TypeShape[]): Promise<void> {
  for (const type of types) {
    const here = await rowsOf(
      client,
      `SELECT t.typtype::text, pg_catalog.format_type(t.typbasetype, t.typtypmod),
              (SELECT pg_catalog.json_agg(e.enumlabel ORDER BY e.enumsortorder) FROM pg_catalog.pg_enum e WHERE e.enumtypid = t.oid)
         FROM pg_catalog.pg_type t WHERE t.typnamespace = pg_catalog.to_regnamespace($1) AND t.typname = $2`,
      [name(type.schema), type.name],
    )
    await installType(client, type, here[0])
  }
}

async function installType(client: pg.Client, type: TypeShape, here: readonly (string | null)[] | undefined): Promise<void> {
  const own = qualified(type.schema, type.name)
  switch (type.kind) {
    case 'enum': {
      const old = here === undefined || here[0] !== 'e' ? null : (JSON.parse(here[2] ?? '[]') as string[])
      if (old !== null && isSubsequence(old, type.labels)) return addLabels(client, own, old, type.labels)
      if (here !== undefined) await moveAside(client, type)
      await client.query(`CREATE TYPE ${own} AS ENUM (${type.labels.map(literal).join(', ')})`)
      break
    }
    case 'domain': {
      if (here?.[0] === 'd' && here[1] === type.base) return
      if (here !== undefined) await moveAside(client, type)
      await client.query(`CREATE DOMAIN ${own} AS ${type.base}`)
      break
    }
    case 'other':
      if (here === undefined) {
        throw new LobbyProblem(
          `the vault uses the type ${type.schema}.${type.name}, which the lobby does not have`,
          'install its extension in the lobby under the same schema, or leave the column out of the policy',
        )
      }
      return
    default:
      return unreachable(type)
  }
  await client.query(`ALTER TYPE ${own} OWNER TO hedgerow_owner`)
  await client.query(`GRANT USAGE ON TYPE ${own} TO PUBLIC`)
}

async function addLabels(client: pg.Client, own: string, old: readonly string[], wanted: readonly string[]): Promise<void> {
  const has = new Set(old)
  for (const [at, label] of wanted.entries()) {
    if (has.has(label)) continue
    const before = wanted[at - 1]
    const first = old[0]
    const place = before !== undefined ? `AFTER ${literal(before)}` : first !== undefined ? `BEFORE ${literal(first)}` : ''
    await client.query(`ALTER TYPE ${own} ADD VALUE ${literal(label)} ${place}`)
  }
}

async function moveAside(client: pg.Client, type: TypeShape): Promise<void> {
  // Every shell is then made anew, also if this load stops half-way.
  await client.query('DELETE FROM hedgerow_inside.made')
  await client.query(`ALTER TYPE ${qualified(type.schema, type.name)} SET SCHEMA hedgerow_stage`)
}

function isSubsequence(short: readonly string[], long: readonly string[]): boolean {
  let at = 0
  for (const label of long) if (short[at] === label) at += 1
  return at === short.length
}
