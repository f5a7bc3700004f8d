import { type TestHedgerow, testHedgerow, type TestHedgerowOptions } from '../harness/hedgerow.ts'

/** 300 riders with ten trips each, three districts of a hundred riders, five published piers; every figure can be worked out by hand. */
export const ferryVault = `
  CREATE TABLE piers (pier_id text PRIMARY KEY, side text NOT NULL);
  INSERT INTO piers VALUES ('p0','west'),('p1','west'),('p2','east'),('p3','east'),('p9','east');
  CREATE TABLE riders (rider_id int PRIMARY KEY, district text NOT NULL, birth_year int, concession boolean, secret_note text);
  CREATE TABLE trips (trip_id bigint PRIMARY KEY, rider_id int NOT NULL REFERENCES riders, pier text REFERENCES piers,
                      boarded_at timestamptz, day date, fare int, weight numeric(6,2));
  INSERT INTO riders SELECT g, (ARRAY['Northbank','Eastquay','Saltmarsh'])[1 + g % 3], 1950 + g % 50, g % 4 = 0, 'kept' FROM generate_series(1, 300) g;
  INSERT INTO trips SELECT g, 1 + g % 300, 'p' || g % 4, timestamptz '2026-01-01 00:00+00' + g * interval '1 hour', date '2026-01-01' + g / 24, g % 7, g % 10
    FROM generate_series(0, 2999) g;`

export const ferryPolicy = `dataset: ferries
schema: public
person: { called: rider, key: riders.rider_id }
defaults: { epsilon: 1e30, delta: 1e-8 }
reply_after: 0.1s
tables:
  riders:
    person: rider_id
    bounds: { groups: 1, rows: 1 }
    columns:
      district: { values: [Northbank, Eastquay, Saltmarsh, Gullhaven] }
      birth_year: { clamp: [1900, 2020] }
      concession: {}
  trips:
    person: rider_id
    bounds: { groups: 10, rows: 100 }
    columns:
      pier: { values_from: piers.pier_id }
      boarded_at: { clamp: [2026-01-01, 2027-01-01] }
      day: { clamp: [2026-01-01, 2026-12-31] }
      fare: { clamp: [0, 10], step: 1 }
      weight: { clamp: [0, 20], step: 0.01 }
  piers: { published: true }
`

export const boundless = '{ epsilon: 1e33, delta: 1e-3, renews: never }'

/** A whole Hedgerow over the ferry world, at an epsilon so large that answers are exact. */
export function ferries(changed: Partial<TestHedgerowOptions> = {}): Promise<TestHedgerow> {
  return testHedgerow({
    vault: ferryVault,
    policy: ferryPolicy,
    analysts: { ana: boundless, ben: boundless },
    everyone: '{ epsilon: 1e34, delta: 1e-2 }',
    ...changed,
  })
}
