-- HAVING without GROUP BY
SELECT count(*) FROM trips HAVING count(*) > 100000;
