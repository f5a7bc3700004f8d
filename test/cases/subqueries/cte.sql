-- a block in a common table
WITH per_kind AS (SELECT kind, count(*) AS n, avg(fare_pence) AS fare FROM trips GROUP BY kind) SELECT kind, n, round(fare, 2) FROM per_kind WHERE n > 10;
