-- LATERAL over finished groups
SELECT q.kind, l.x FROM (SELECT kind, count(*) AS n FROM trips GROUP BY kind) q CROSS JOIN LATERAL (SELECT q.n * 2 AS x) l;
