-- two scalar subqueries as a ratio
SELECT (SELECT count(*) FROM trips WHERE stars > 0)::numeric / (SELECT count(*) FROM trips) AS liked;
