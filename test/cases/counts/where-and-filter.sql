-- FILTER and WHERE both apply
SELECT count(*) FILTER (WHERE stars > 0), count(*) FILTER (WHERE fare_pence IS NULL), count(DISTINCT rider_id) FILTER (WHERE kind = 'season'), count(*) FROM trips WHERE from_pier = 2;
