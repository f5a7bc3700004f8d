-- a date as it is
-- differs: single-person groups
SELECT travelled, count(*) FROM trips WHERE stars > 2 GROUP BY travelled;
-- instead
SELECT travelled, count(*) FROM trips WHERE stars > 2 GROUP BY travelled HAVING count(DISTINCT rider_id) > 1;
