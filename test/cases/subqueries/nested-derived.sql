-- derived tables in derived tables
SELECT q, count(*) FROM (SELECT k AS q FROM (SELECT kind AS k, stars FROM trips WHERE stars > -3) a WHERE stars < 3) b GROUP BY q;
