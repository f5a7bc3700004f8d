/** A small ferry company that is rich in corners: NULLs, NaN, infinities, extremes, ties, quoted names, a rider without a trip, a trip without a pier, groups of one person. */
export const ferryVault = `
CREATE TYPE trip_kind AS ENUM ('single', 'return', 'season');
CREATE TYPE "Mood" AS ENUM ('calm', 'Sea sick', 'elated');
CREATE TABLE piers (pier_id int PRIMARY KEY, name text NOT NULL UNIQUE, zone smallint NOT NULL, opened date NOT NULL, roofed boolean NOT NULL);
INSERT INTO piers VALUES
  (1, 'North Stairs', 1, '1901-05-04', true), (2, 'Eel Steps', 1, '1955-01-31', false), (3, 'Salt Wharf', 2, '2000-02-29', true),
  (4, 'Gull Rock', 3, '1999-12-31', false), (5, 'Old Weir', 2, '2010-07-01', true), (6, 'Nowhere Jetty', 3, '2024-11-11', false);
CREATE TABLE tariffs (zone smallint NOT NULL, season text NOT NULL, price numeric(6,2) NOT NULL, PRIMARY KEY (zone, season));
INSERT INTO tariffs SELECT z, s, z * 2.25 + length(s) FROM generate_series(1, 3) z, unnest(ARRAY['summer', 'winter']) s;
CREATE TABLE months (month timestamptz PRIMARY KEY, next timestamptz NOT NULL, label text NOT NULL);
INSERT INTO months SELECT m, m + interval '1 month', to_char(m AT TIME ZONE 'UTC', 'YYYY-MM') FROM generate_series(timestamptz '2025-01-01 00:00+00', timestamptz '2025-06-01 00:00+00', interval '1 month') m;

CREATE TABLE riders (
  rider_id int PRIMARY KEY, district text NOT NULL, birth_year int, concession boolean NOT NULL, newsletter boolean,
  home_pier int REFERENCES piers, nickname varchar(12), last_seen timestamptz NOT NULL, joined date NOT NULL);
INSERT INTO riders SELECT g, (ARRAY['Northbank', 'Eastquay', 'Saltmarsh'])[1 + g % 3], CASE WHEN g % 11 = 0 THEN NULL ELSE 1930 + g * 7 % 75 END, g % 4 = 0,
  CASE g % 3 WHEN 0 THEN NULL WHEN 1 THEN true ELSE false END, CASE WHEN g % 9 = 0 THEN NULL ELSE 1 + g % 5 END,
  CASE WHEN g % 5 = 0 THEN NULL WHEN g = 7 THEN '' ELSE (ARRAY['Tern', 'tern', 'Gull%', 'g_ll', 'Ærfugl'])[1 + g % 5] END,
  now() - g * interval '1 hour' + interval '30 minutes', date '2020-01-01' + g * 29
FROM generate_series(1, 64) g;

CREATE TABLE trips (
  trip_id bigint PRIMARY KEY, rider_id int NOT NULL REFERENCES riders, boarded_at timestamptz NOT NULL, travelled date NOT NULL, from_pier int REFERENCES piers, to_pier int REFERENCES piers,
  fare_pence int, delay_min numeric(5,1), weight_kg double precision, stars smallint, kind trip_kind NOT NULL, note text);
INSERT INTO trips SELECT g, 1 + (g * g * 7 + g * 13 + g / 3) % 60, timestamptz '2025-01-01 00:30+00' + g * interval '9 hours 17 minutes', date '2025-01-01' + g * 7 % 170,
  CASE WHEN g % 13 = 0 THEN NULL ELSE 1 + g % 5 END, CASE WHEN g % 17 = 0 THEN NULL ELSE 1 + g * 3 % 4 END,
  CASE WHEN g % 10 = 0 THEN NULL ELSE g * 37 % 1200 END, CASE WHEN g % 8 = 0 THEN NULL ELSE g * 11 % 900 * 0.1 END, CASE WHEN g % 9 = 0 THEN NULL ELSE (g * 7 % 400) * 0.25 END,
  CASE WHEN g % 6 = 0 THEN NULL ELSE g % 11 - 5 END, (ARRAY['single', 'return', 'season'])[1 + g % 3]::trip_kind,
  CASE WHEN g % 4 = 0 THEN NULL WHEN g = 211 THEN 'one of a kind' ELSE (ARRAY['late', 'Late', 'windy ', 'wet', 'fog, thick'])[1 + g % 5] END
FROM generate_series(1, 420) g;

CREATE TABLE complaints (complaint_id int PRIMARY KEY, trip_id bigint NOT NULL REFERENCES trips, topic text, severity smallint NOT NULL, filed date NOT NULL, resolved boolean);
INSERT INTO complaints SELECT g, 1 + g * 17 % 400, CASE WHEN g % 12 = 0 THEN NULL WHEN g = 31 THEN 'gulls' ELSE (ARRAY['noise', 'delay', 'crew', 'fare'])[1 + g % 4] END, 1 + g % 5,
  date '2025-01-10' + g * 3, CASE g % 3 WHEN 0 THEN NULL WHEN 1 THEN true ELSE false END
FROM generate_series(1, 97) g;

CREATE TABLE "Season Tickets" ("Ticket No" int PRIMARY KEY, "Rider" int NOT NULL REFERENCES riders, "Zone" smallint NOT NULL, "Paid" numeric(8,2), "Valid From" date NOT NULL, "select" text);
INSERT INTO "Season Tickets" SELECT g, 1 + g * 5 % 40, 1 + g % 3, CASE WHEN g % 7 = 0 THEN NULL ELSE g * 12.35 END, date '2025-01-01' + g * 4, (ARRAY['a"b', 'c''d', 'e\\f'])[1 + g % 3] FROM generate_series(1, 75) g;

CREATE TABLE events (
  event_id int PRIMARY KEY, rider_id int NOT NULL REFERENCES riders, b boolean, i2 smallint, i4 int, i8 bigint, n numeric, n2 numeric(8,2), r real, d double precision, t text, v varchar(10), c char(6),
  dt date, ts timestamp, tz timestamptz, tm time, u uuid, e "Mood");
INSERT INTO events SELECT g, 1 + g * 3 % 50, g % 2 = 0, (g * 331 % 2001) - 1000, g * 7919 % 100001 - 50000, g * 1234567::bigint - 60000000, (g * 17 % 500) * 0.125, g * 1.01 - 40, (g % 64) * 0.5, (g % 80) * 0.125 - 3,
  'word ' || g % 7, 'v' || g % 4, 'c' || g % 3, date '2024-12-25' + g, timestamp '2025-02-01 12:00' + g * interval '7 hours', timestamptz '2025-03-01 00:00+00' + g * interval '5 hours 13 minutes',
  time '05:00' + g * interval '11 minutes', ('00000000-0000-4000-8000-00000000000' || g % 5)::uuid, (ARRAY['calm', 'Sea sick', 'elated'])[1 + g % 3]::"Mood"
FROM generate_series(1, 110) g;
INSERT INTO events (event_id, rider_id) SELECT 200 + g, g FROM generate_series(1, 12) g;
INSERT INTO events VALUES
  (301, 1, NULL, -32768, -2147483648, -9223372036854775808, 'NaN', 'NaN', 'NaN', 'NaN', '', '', '', '-infinity', '-infinity', '-infinity', '00:00', '00000000-0000-0000-0000-000000000000', 'calm'),
  (302, 2, true, 32767, 2147483647, 9223372036854775807, 'Infinity', 999999.99, 'Infinity', 'Infinity', 'Æ ß 漢 🚢', 'Æ', 'Æ', 'infinity', 'infinity', 'infinity', '24:00', 'ffffffff-ffff-ffff-ffff-ffffffffffff', 'elated'),
  (303, 3, false, 0, 0, 0, '-Infinity', 0, '-0', '-Infinity', repeat('x', 300), '  ', '  ', '4714-11-24 BC', '4714-11-24 00:00:00 BC', '2025-03-30 01:59:59.999999+00', '23:59:59.999999', NULL, NULL);
ANALYZE;
`

/** Bounds so wide that nothing of that data is cut. */
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
      newsletter: {}
      home_pier: { values_from: piers.pier_id }
      nickname: {}
      last_seen: { clamp: [2020-01-01, 2120-01-01] }
      joined: { clamp: [2019-01-01, 2030-01-01] }
  trips:
    person: rider_id
    bounds: { groups: 500, rows: 500 }
    columns:
      boarded_at: { clamp: [2025-01-01, 2025-07-01] }
      travelled: { clamp: [2025-01-01, 2025-06-30] }
      from_pier: { values_from: piers.pier_id }
      to_pier: { values_from: piers.pier_id }
      fare_pence: { clamp: [0, 2500], step: 1 }
      delay_min: { clamp: [0, 120], step: 0.1 }
      weight_kg: { clamp: [0, 200], step: 0.25 }
      stars: { clamp: [-5, 5] }
      kind: { values: [single, return, season] }
      note: {}
  complaints:
    person: { through: trips.trip_id, by: trip_id }
    bounds: { groups: 500, rows: 500 }
    columns:
      complaint_id: {}
      topic: {}
      severity: { clamp: [1, 5], values: [1, 2, 3, 4, 5] }
      filed: { clamp: [2025-01-01, 2025-12-31] }
      resolved: {}
  Season Tickets:
    person: Rider
    bounds: { groups: 500, rows: 500 }
    columns:
      Ticket No: {}
      Zone: { clamp: [1, 3], values: [1, 2, 3] }
      Paid: { clamp: [0, 2000], step: 0.01 }
      Valid From: { clamp: [2025-01-01, 2026-01-01] }
      select: {}
  events:
    person: rider_id
    bounds: { groups: 500, rows: 500 }
    columns:
      event_id: {}
      b: {}
      i2: { clamp: [-32768, 32767] }
      i4: { clamp: [-2147483648, 2147483647] }
      i8: { clamp: [-1000000000, 1000000000] }
      n: { clamp: [-1000, 1000], step: 0.125 }
      n2: { clamp: [-999999.99, 999999.99] }
      r: { clamp: [-100, 100], step: 0.5 }
      d: { clamp: [-100, 100], step: 0.125 }
      t: {}
      v: {}
      c: {}
      dt: { clamp: [2024-01-01, 2026-01-01] }
      ts: { clamp: [2025-01-01, 2026-01-01] }
      tz: { clamp: [2025-01-01, 2026-01-01] }
      tm: {}
      u: {}
      e: { values: [calm, Sea sick, elated] }
  piers: { published: true }
  tariffs: { published: true }
  months: { published: true }
`
