-- LIMIT 0 is typed and free
-- free
SELECT kind, count(*), avg(fare_pence), sum(delay_min), sum(weight_kg) AS w FROM trips GROUP BY kind LIMIT 0;
