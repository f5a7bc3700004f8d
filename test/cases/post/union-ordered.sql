-- a UNION of blocks, ordered and cut
-- ordered
(SELECT 1 AS n, count(*) FROM trips) UNION (SELECT 2, count(*) FROM complaints) ORDER BY n DESC LIMIT 1;
