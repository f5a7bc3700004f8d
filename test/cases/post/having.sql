-- HAVING over an aggregate
SELECT kind, count(*) FROM trips GROUP BY kind HAVING count(*) > 139 AND avg(fare_pence) IS NOT NULL;
