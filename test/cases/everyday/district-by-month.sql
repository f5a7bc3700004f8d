-- a join, two keys and a range
SET TimeZone = 'UTC';
SELECT r.concession, date_trunc('quarter', t.travelled) AS q, count(*), sum(t.fare_pence), count(DISTINCT t.rider_id) FROM trips t JOIN riders r USING (rider_id) GROUP BY 1, 2;
