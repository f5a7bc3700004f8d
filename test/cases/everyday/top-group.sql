-- the largest group
-- ordered
SELECT p.name, count(*) AS n FROM trips t JOIN piers p ON p.pier_id = t.from_pier WHERE p.zone = 2 GROUP BY p.name ORDER BY n DESC, p.name LIMIT 1;
