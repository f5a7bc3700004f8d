-- a block in a derived table, post-processed
SELECT max(n), min(n), sum(n) FROM (SELECT kind, count(*) AS n FROM trips GROUP BY kind) AS q;
