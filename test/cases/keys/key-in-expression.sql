-- an expression over keys
SELECT 'is ' || kind::text AS what, count(*) FROM trips GROUP BY kind;
