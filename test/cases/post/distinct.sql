-- DISTINCT over finished groups
SELECT DISTINCT count(*) > 10 AS many FROM complaints GROUP BY severity;
