-- a mean with FILTER beside one without
SELECT avg(fare_pence) FILTER (WHERE kind = 'single') AS single, avg(fare_pence) AS every FROM trips;
