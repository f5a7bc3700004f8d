-- LIMIT and OFFSET over finished groups
-- ordered
SELECT severity, count(*) FROM complaints GROUP BY severity ORDER BY severity LIMIT 2 OFFSET 1;
