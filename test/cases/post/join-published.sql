-- the finished result joined with a published table
SELECT p.name, q.n FROM (SELECT from_pier, count(*) AS n FROM trips WHERE from_pier IS NOT NULL GROUP BY from_pier) q JOIN piers p ON p.pier_id = q.from_pier WHERE p.zone < 3;
