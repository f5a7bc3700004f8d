-- an integer parameter
-- parameter: int4 2
SELECT count(*), sum(fare_pence) FROM trips WHERE from_pier = $1;
