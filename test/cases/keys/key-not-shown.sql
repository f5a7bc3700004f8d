-- a key that is not in the list
-- ordered
SELECT count(*) FROM trips GROUP BY kind ORDER BY kind;
