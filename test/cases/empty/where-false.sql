-- WHERE false of an aggregate is one row
-- free
SELECT count(*), sum(fare_pence), avg(delay_min), count(DISTINCT rider_id) FROM trips WHERE false;
