-- the same key twice
SELECT kind, kind AS again, count(*) FROM trips GROUP BY kind, kind;
