-- date_trunc of a date is a timestamptz, as in PostgreSQL
SET TimeZone = 'UTC';
SELECT date_trunc('quarter', travelled), count(*), sum(stars) FROM trips GROUP BY 1;
