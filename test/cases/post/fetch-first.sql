-- FETCH FIRST WITH TIES
-- ordered
SELECT severity, count(*) FROM complaints GROUP BY severity ORDER BY severity FETCH FIRST 2 ROWS WITH TIES;
