-- a number put into buckets
-- differs: single-person groups
SELECT fare_pence / 100 * 100 AS pence, count(*) FROM trips WHERE stars > 3 GROUP BY 1;
-- instead
SELECT fare_pence / 100 * 100 AS pence, count(*) FROM trips WHERE stars > 3 GROUP BY 1 HAVING count(DISTINCT rider_id) > 1;
