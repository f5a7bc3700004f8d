-- the same aggregate twice, and in an expression
SELECT count(*) AS a, count(*) AS b, count(*) * 2 AS c, count(*) + sum(fare_pence) AS d FROM trips;
