-- rows joined with a temporary result
-- refused: block.mixed
SELECT count(*) FROM trips t JOIN (SELECT kind, count(*) AS n FROM trips GROUP BY kind) k ON k.kind = t.kind;
