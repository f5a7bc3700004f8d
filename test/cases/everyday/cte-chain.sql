-- rows, groups and ratios in a chain of common tables
WITH good AS (SELECT kind, fare_pence FROM trips WHERE stars >= 0), sums AS (SELECT kind, sum(fare_pence) AS pence, count(*) AS n FROM good GROUP BY kind), shares AS (SELECT kind, round(pence::numeric / n, 3) AS mean FROM sums) SELECT * FROM shares WHERE mean > 0;
