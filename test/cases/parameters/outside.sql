-- parameters outside the block only
-- parameter: int8 100
-- parameter: text kinds
SELECT $2::text, kind, count(*) FROM trips GROUP BY kind HAVING count(*) > $1::bigint;
