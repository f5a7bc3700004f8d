-- a parameter inside an aggregate
-- parameter: int4 3
SELECT sum(fare_pence * $1), count(*) FILTER (WHERE stars > $1) FROM trips;
