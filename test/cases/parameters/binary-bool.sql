-- a boolean and a bigint in binary
-- binary
-- parameter: bool false
-- parameter: int8 200
SELECT count(*) FROM trips JOIN riders USING (rider_id) WHERE concession = $1 AND fare_pence < $2::bigint;
