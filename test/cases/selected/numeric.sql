-- a numeric key
-- differs: single-person groups
SELECT n, count(*) FROM events WHERE n < 1000 AND n > 0 GROUP BY n;
-- instead
SELECT trim_scale(n) AS n, count(*) FROM events WHERE n < 1000 AND n > 0 GROUP BY 1 HAVING count(DISTINCT rider_id) > 1;
