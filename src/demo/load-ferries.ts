import pg from 'pg'
import { districts, ferryConstraints, ferryTables, piers, topics } from './schema.ts'

/** How far the loading has come: a fraction from 0 to 1, and what is being done. */
export type LoadProgress = (fraction: number, doing: string) => void

/** How many riders the company has, and in how many parts their trips are made. */
const defaultRiders = 25_000
const parts = 20

/**
 * Makes the ferry company's tables in the empty database at `url` and fills them: 25,000 riders and about 600,000 trips, the same on every call. All in one transaction.
 * Another number of riders gives the first so many of them.
 */
export async function loadFerries(url: string, progress: LoadProgress = () => undefined, riders = defaultRiders): Promise<void> {
  const client = new pg.Client({ connectionString: url, application_name: 'hedgerow demo' })
  client.on('error', () => undefined)
  await client.connect()
  try {
    await client.query("SET TimeZone = 'UTC'; SET work_mem = '64MB'; SET maintenance_work_mem = '128MB'")
    await client.query('BEGIN')
    await client.query(ferryTables)
    progress(0, 'piers and riders')
    await fillPiers(client)
    await client.query(fillRiders, [riders, [...districts]])
    await client.query(fillTally)
    for (let part = 0; part < parts; part++) {
      progress(0.05 + (0.7 * part) / parts, 'trips')
      await client.query(fillTrips, [Math.floor((riders * part) / parts), Math.floor((riders * (part + 1)) / parts), [...districts]])
    }
    progress(0.75, 'complaints')
    await client.query(fillComplaints, [[...topics]])
    for (const [index, statement] of ferryConstraints.entries()) {
      progress(0.8 + (0.15 * index) / ferryConstraints.length, 'keys and indexes')
      await client.query(statement)
    }
    await client.query('COMMIT')
    progress(0.95, 'statistics')
    await client.query('ANALYZE public.piers, public.riders, public.trips, public.complaints')
    progress(1, 'done')
  } finally {
    await client.end()
  }
}

async function fillPiers(client: pg.Client): Promise<void> {
  await client.query('INSERT INTO public.piers SELECT * FROM jsonb_to_recordset($1) AS p(pier_id integer, name text, zone integer, opened date)', [
    JSON.stringify(piers),
  ])
}

/** A number in [0, 1) that depends on `key` and `stream` alone: PostgreSQL's seeded 64-bit hash, its upper 31 usable bits. */
function draw(key: string, stream: number): string {
  return `((hashint8extended((${key})::bigint, ${7432_000 + stream}) & 2147483647)::float8 / 2147483648)`
}

const fillRiders = `
INSERT INTO public.riders
SELECT
  r,
  CASE WHEN ${draw('r', 1)} < 0.98 THEN born END,
  ($2::text[])[1 + floor(6 * power(${draw('r', 2)}, 1.4))::integer],
  born < 1961 OR born > 2008 OR ${draw('r', 3)} < 0.06,
  date '2021-03-01' + floor(1900 * sqrt(${draw('r', 4)}))::integer
FROM generate_series(1, $1::integer) AS r
CROSS JOIN LATERAL (SELECT 1938 + floor(38 * (${draw('r', 5)} + ${draw('r', 6)}))::integer) AS age(born)`

/** How many trips each rider makes: none for one in fourteen, else a power law with exponent 1.25, which ends between 4,000 and 6,500. */
const fillTally = `
CREATE TEMP TABLE tally ON COMMIT DROP AS
SELECT rider_id, trips, (1 + sum(trips) OVER (ORDER BY rider_id) - trips)::integer AS first_trip
FROM public.riders
CROSS JOIN LATERAL (
  SELECT CASE WHEN ${draw('rider_id', 7)} < 0.07 THEN 0 ELSE floor(least(4000 + 2500 * ${draw('rider_id', 9)}, 6.2 * power(1 - ${draw('rider_id', 8)}, -0.8)))::integer END
) AS made(trips)`

/** Riders $1 (excluded) to $2: mostly from and to their two usual piers, at the busy hours, later in winter. */
const fillTrips = `
INSERT INTO public.trips
SELECT
  trip_id,
  rider_id,
  boarded_at,
  from_pier,
  to_pier,
  (CASE WHEN concession THEN 0.5 ELSE 1 END * (180 + 70 * abs(from_zone - to_zone) + CASE WHEN ${draw('trip_id', 11)} < 0.12 THEN 240 ELSE 0 END))::integer,
  CASE WHEN ${draw('trip_id', 12)} < 0.97 THEN
    least(240, floor(-ln(1 - ${draw('trip_id', 13)}) * CASE WHEN extract(month FROM boarded_at) IN (1, 2, 11, 12) THEN 13 ELSE 6 END) * 0.5)::numeric(5,1)
  END
FROM (
  SELECT
    first_trip + i - 1 AS trip_id, rider_id, concession,
    CASE WHEN ${draw('first_trip + i - 1', 14)} < 0.6 THEN usual.pier ELSE 1 + floor(8 * ${draw('first_trip + i - 1', 15)})::integer END AS from_pier,
    1 + floor(7 * ${draw('first_trip + i - 1', 16)})::integer AS step,
    timestamptz '2025-01-01 05:00+00'
      + interval '1 day' * floor(earliest + (729 - earliest) * ${draw('first_trip + i - 1', 17)})
      + interval '1 minute' * floor(CASE WHEN ${draw('first_trip + i - 1', 18)} < 0.55 THEN 90 + 150 * ${draw('first_trip + i - 1', 19)} ELSE 1080 * ${draw('first_trip + i - 1', 19)} END) AS boarded_at
  FROM tally
  JOIN public.riders USING (rider_id)
  CROSS JOIN LATERAL (SELECT 1 + (array_position($3::text[], district) - 1 + CASE WHEN ${draw('rider_id', 20)} < 0.3 THEN 2 ELSE 0 END) % 8) AS usual(pier)
  CROSS JOIN LATERAL (SELECT greatest(0, joined - date '2025-01-01')) AS since(earliest)
  CROSS JOIN generate_series(1, trips) AS i
  WHERE rider_id > $1::integer AND rider_id <= $2::integer
) AS made
CROSS JOIN LATERAL (SELECT 1 + (from_pier - 1 + step) % 8) AS there(to_pier)
JOIN (SELECT pier_id, zone FROM public.piers) AS a(from_id, from_zone) ON from_id = from_pier
JOIN (SELECT pier_id, zone FROM public.piers) AS b(to_id, to_zone) ON to_id = to_pier`

/** About one trip in fifty, more where it was late; the topic's rank falls off steeply. */
const fillComplaints = `
INSERT INTO public.complaints
SELECT
  (row_number() OVER (ORDER BY trip_id))::integer,
  trip_id,
  CASE WHEN delay_min > 8 AND ${draw('trip_id', 21)} < 0.7 THEN 'delay' ELSE ($1::text[])[1 + least(10, floor(ln(1 - ${draw('trip_id', 22)}) / ln(0.56)))::integer] END,
  boarded_at::date + floor(21 * power(${draw('trip_id', 23)}, 2))::integer
FROM public.trips
WHERE ${draw('trip_id', 24)} < CASE WHEN delay_min > 8 THEN 0.1 ELSE 0.015 END`
