-- a temporary view is asked each time it is read
CREATE TEMP VIEW liked AS SELECT kind, count(*) AS n FROM trips WHERE stars > 0 GROUP BY kind;
SELECT * FROM liked;
SELECT sum(n) FROM liked;
