-- a common table of rows, used twice
WITH good AS (SELECT rider_id, fare_pence, kind FROM trips WHERE stars > 0) SELECT (SELECT count(*) FROM good), (SELECT sum(fare_pence) FROM good WHERE kind = 'season');
