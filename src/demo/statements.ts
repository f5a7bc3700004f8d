/** One statement of the demo, and what it is there to show. */
export interface DemoStatement {
  readonly point: string
  readonly sql: string
  readonly outcome: 'private answer' | 'free' | 'refused'
}

/** What the demo asks about the ferries, in this order: a later one may use what an earlier one has made. */
export const demoStatements: readonly DemoStatement[] = [
  {
    point: 'a published table on the left of a LEFT JOIN names the groups: the pier without trips is listed like the others, with noise on zero',
    sql: `SELECT p.name, count(t.from_pier) AS trips
FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id
GROUP BY p.name
ORDER BY trips DESC`,
    outcome: 'private answer',
  },
  {
    point: 'a join of two private tables on the person, and an average from a noisy sum and a noisy count',
    sql: `SELECT r.district, round(avg(t.fare_pence), 1) AS fare_pence
FROM riders r JOIN trips t USING (rider_id)
GROUP BY r.district
ORDER BY r.district`,
    outcome: 'private answer',
  },
  {
    point: 'a ratio of two noisy counts is arithmetic on released numbers, and costs nothing more than the counts',
    sql: `SELECT date_trunc('quarter', t.boarded_at)::date AS quarter,
       round(count(*) FILTER (WHERE r.concession)::numeric / nullif(count(*), 0), 3) AS concession_share
FROM trips t JOIN riders r USING (rider_id)
GROUP BY 1
HAVING count(*) > 5000
ORDER BY 1`,
    outcome: 'private answer',
  },
  {
    point: 'HAVING, ORDER BY and LIMIT run over the finished rows, in plain PostgreSQL',
    sql: `SELECT from_pier, round(avg(delay_min), 2) AS delay_min, count(*) AS trips
FROM trips
WHERE boarded_at >= '2026-01-01'
GROUP BY from_pier
HAVING count(*) > 5000
ORDER BY delay_min DESC
LIMIT 3`,
    outcome: 'private answer',
  },
  {
    point: 'topics are not declared in the policy: only those that enough riders complained about are named',
    sql: `SELECT topic, count(*) AS complaints
FROM complaints
GROUP BY topic
ORDER BY complaints DESC`,
    outcome: 'private answer',
  },
  {
    point: 'a window over finished groups: shares of the noisy total',
    sql: `SELECT district, count(*) AS riders, round(100.0 * count(*) / sum(count(*)) OVER (), 1) AS percent
FROM riders
GROUP BY district
ORDER BY riders DESC`,
    outcome: 'private answer',
  },
  {
    point: 'an answer can be kept in a temporary table',
    sql: `CREATE TEMP TABLE boarded AS
SELECT from_pier, count(*) AS trips, count(DISTINCT rider_id) AS riders
FROM trips
GROUP BY from_pier`,
    outcome: 'private answer',
  },
  {
    point: 'what was released can be asked about without end: this touches no private table and is free',
    sql: `SELECT p.zone, sum(b.trips) AS trips, round(sum(b.trips)::numeric / nullif(sum(b.riders), 0), 1) AS trips_per_rider
FROM boarded b JOIN piers p ON p.pier_id = b.from_pier
GROUP BY p.zone
ORDER BY p.zone`,
    outcome: 'free',
  },
  {
    point: "people's rows are not answered; the hint holds a statement that is",
    sql: 'SELECT * FROM trips LIMIT 5',
    outcome: 'refused',
  },
]
