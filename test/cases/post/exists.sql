-- EXISTS over a finished block
SELECT p.name FROM piers p WHERE EXISTS (SELECT 1 FROM (SELECT count(*) AS n FROM trips) q WHERE q.n > p.pier_id * 100);
