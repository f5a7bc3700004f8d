-- ORDER BY an alias, descending
-- ordered
SELECT kind, sum(fare_pence) AS pence FROM trips GROUP BY kind ORDER BY pence DESC, kind;
