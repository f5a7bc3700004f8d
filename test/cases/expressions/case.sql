-- CASE in a sum
SELECT sum(CASE WHEN kind = 'return' THEN 2 ELSE 1 END), sum(CASE WHEN stars > 0 THEN fare_pence ELSE -5 END), avg(CASE WHEN stars IS NULL THEN 0 WHEN stars > 0 THEN 1 END) FROM trips;
