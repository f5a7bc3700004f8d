-- sums with FILTER, several conditions
SELECT sum(fare_pence) FILTER (WHERE kind = 'return'), sum(fare_pence) FILTER (WHERE kind <> 'return' AND stars IS NOT NULL) FROM trips;
