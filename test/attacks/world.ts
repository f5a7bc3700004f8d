import pg from 'pg'
import { type TestHedgerow, testHedgerow } from '../harness/hedgerow.ts'

/** A ferry company whose columns invite every trick: keys beyond 2^53, floats of both sizes, plain numerics, an integer with a coarse step. */
export const hostileVault = `
  CREATE TABLE riders (rider_id int8 PRIMARY KEY, district text NOT NULL, joined date, nick text COLLATE "POSIX", motto text COLLATE "C");
  CREATE TABLE trips (trip_id int8 PRIMARY KEY, rider_id int8 NOT NULL REFERENCES riders, pier int, fare int, bundle int, boarded timestamptz, delay float8, weight float4, tip numeric, exact numeric(10,2));
  CREATE TABLE piers (pier_id int PRIMARY KEY, name text NOT NULL);
  INSERT INTO piers VALUES (1, 'north'), (2, 'south'), (3, 'east');
  INSERT INTO riders SELECT g, (ARRAY['a','b','c'])[1 + g % 3], DATE '2020-01-01' + g, 'n' || g, 'm' || g FROM generate_series(1, 30) g;
  INSERT INTO riders VALUES (9007199254740992, 'a', DATE '2021-01-01', 'x', 'x'), (9007199254740993, 'b', DATE '2021-01-02', 'y', 'y');
  INSERT INTO trips SELECT g, 1 + g % 30, 1 + g % 3, g % 11, 1 + g % 7, TIMESTAMPTZ '2025-03-01 00:00+00' + g * INTERVAL '1 hour', g % 10, g % 10, g % 10, g % 10 FROM generate_series(1, 300) g;
  INSERT INTO trips SELECT 1000 + g, 9007199254740992 + g % 2, 1, 5, 1, TIMESTAMPTZ '2025-05-01 00:00+00', 1, 1, 1, 1 FROM generate_series(1, 8) g;`

/** An account that bears hundreds of statements whose noise is zero by its scale: what comes back is exact. */
export const hostilePolicy = `dataset: ferries
schema: public
person: { called: rider, key: riders.rider_id }
defaults: { epsilon: 1e30, delta: 1e-12 }
reply_after: 0.1s
tables:
  riders:
    person: rider_id
    bounds: { groups: 1, rows: 1 }
    columns:
      district: { values: [a, b, c] }
      joined: { clamp: [2000-01-01, 2030-12-31] }
      nick: {}
      motto: {}
  trips:
    person: rider_id
    bounds: { groups: 12, rows: 20 }
    columns:
      pier: { values_from: piers.pier_id }
      trip_id: {}
      fare: { clamp: [0, 10], step: 1 }
      bundle: { clamp: [0, 10], step: 5 }
      boarded: { clamp: [2025-01-01, 2026-12-31] }
      delay: { clamp: [0, 10], step: 1 }
      weight: { clamp: [0, 1234567], step: 1 }
      tip: { clamp: [0, 10] }
      exact: { clamp: [0, 10] }
  piers: { published: true }
`

export async function hostileWorld(
  options: { readonly more?: string; readonly clock?: 'prompt' | 'real'; readonly statementTimeoutMs?: number; readonly policy?: string } = {},
): Promise<TestHedgerow> {
  return testHedgerow({
    vault: hostileVault + (options.more ?? ''),
    policy: options.policy ?? hostilePolicy,
    analysts: { ana: '{ epsilon: 1e34, delta: 1e-3, renews: never }', bob: '{ epsilon: 1e34, delta: 1e-3, renews: never }' },
    everyone: '{ epsilon: 1e35, delta: 1e-2 }',
    ...(options.clock === undefined ? {} : { clock: options.clock }),
    ...(options.statementTimeoutMs === undefined ? {} : { statementTimeoutMs: options.statementTimeoutMs }),
  })
}

export interface Complained {
  readonly code: string
  readonly message: string
  readonly hint: string
}

/** What a statement gives: its rows as text, or its error. */
export async function outcomeOf(
  client: pg.Client,
  sql: string,
  values: readonly unknown[] = [],
): Promise<{ readonly rows: readonly (readonly (string | null)[])[] } | Complained> {
  try {
    const result = await client.query<(string | null)[]>({ text: sql, values: [...values], rowMode: 'array' })
    return { rows: result.rows }
  } catch (problem) {
    if (!(problem instanceof pg.DatabaseError)) throw problem
    return { code: problem.code ?? '', message: problem.message, hint: problem.hint ?? '' }
  }
}
