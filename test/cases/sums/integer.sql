-- sum of integers is a bigint, sum of a smallint too
SELECT sum(fare_pence), sum(stars) FROM trips;
