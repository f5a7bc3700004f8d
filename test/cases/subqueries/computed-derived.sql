-- a derived table that computes
SELECT sum(x), count(*) FROM (SELECT fare_pence / 100 AS x FROM trips) AS t WHERE x > 3;
