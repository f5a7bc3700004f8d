-- ORDER BY a position, NULLS FIRST
-- ordered
SELECT newsletter, count(*) FROM riders GROUP BY newsletter ORDER BY 1 DESC NULLS LAST;
