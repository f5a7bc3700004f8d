-- ORDER BY an aggregate with FILTER, ties by name
-- ordered
SELECT kind, count(*) FROM trips GROUP BY kind ORDER BY count(*) FILTER (WHERE stars > 0) DESC, kind;
