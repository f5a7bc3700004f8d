-- generate_series names the days
SELECT d::date AS day, count(t.trip_id) FROM generate_series(timestamp '2025-02-01', timestamp '2025-02-14', interval '1 day') AS d LEFT JOIN trips t ON t.travelled = d::date GROUP BY 1;
