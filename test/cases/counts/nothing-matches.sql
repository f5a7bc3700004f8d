-- a count over a condition that no row meets is 0
SELECT count(*), count(DISTINCT rider_id) FROM trips WHERE fare_pence > 100000 AND fare_pence < 0;
