-- even aggregates that are not answered are typed without rows
-- free
SELECT min(fare_pence), max(note), string_agg(note, ','), percentile_cont(0.5) WITHIN GROUP (ORDER BY fare_pence) FROM trips WHERE false;
