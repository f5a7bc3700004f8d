-- UNION ALL inside a derived table, then added up
SELECT sum(n), count(*) FROM (SELECT count(*) AS n FROM trips WHERE kind = 'single' UNION ALL SELECT count(*) FROM trips WHERE kind = 'return') AS u;
