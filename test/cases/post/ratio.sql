-- a ratio of two aggregates
SELECT kind, count(*) FILTER (WHERE stars > 0)::float8 / count(*) AS liked, sum(fare_pence) / nullif(count(fare_pence), 0) FROM trips GROUP BY kind;
