-- a common table that names its columns
WITH t(who, pence) AS (SELECT rider_id, fare_pence FROM trips) SELECT count(DISTINCT who), sum(pence) FROM t;
