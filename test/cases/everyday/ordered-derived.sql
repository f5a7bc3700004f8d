-- ORDER BY inside a derived table means nothing
SELECT count(*) FROM (SELECT kind FROM trips ORDER BY trip_id) AS t;
