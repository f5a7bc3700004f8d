-- two blocks joined on their keys
SELECT t.kind, t.n, s.late FROM (SELECT kind, count(*) AS n FROM trips GROUP BY kind) t JOIN (SELECT kind, count(*) AS late FROM trips WHERE delay_min > 20 GROUP BY kind) s USING (kind);
