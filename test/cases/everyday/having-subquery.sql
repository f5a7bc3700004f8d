-- HAVING against another block
SELECT kind, avg(fare_pence) FROM trips GROUP BY kind HAVING avg(fare_pence) > (SELECT avg(fare_pence) FROM trips);
