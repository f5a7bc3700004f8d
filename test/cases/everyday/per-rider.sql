-- how many trips a rider makes, as a ratio
SELECT count(*)::numeric / nullif(count(DISTINCT rider_id), 0) AS each FROM trips;
