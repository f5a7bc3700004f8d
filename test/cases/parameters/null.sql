-- a NULL parameter
-- parameter: int4 NULL
SELECT count(*), count(*) FILTER (WHERE from_pier IS NOT DISTINCT FROM $1) FROM trips WHERE from_pier IS NULL OR from_pier = $1;
