-- CREATE TEMP TABLE AS, then queried for nothing
CREATE TEMP TABLE per_kind AS SELECT kind, count(*) AS n, avg(fare_pence) AS fare FROM trips GROUP BY kind;
SELECT kind, n, fare FROM per_kind WHERE n > 0;
SELECT sum(n) FROM per_kind;
