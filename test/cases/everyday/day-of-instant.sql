-- the day of an instant in the session's time zone
-- differs: single-person groups
SET TimeZone = 'UTC';
SELECT boarded_at::date AS day, count(*) FROM trips WHERE stars > 0 GROUP BY 1;
-- instead
SET TimeZone = 'UTC';
SELECT boarded_at::date AS day, count(*) FROM trips WHERE stars > 0 GROUP BY 1 HAVING count(DISTINCT rider_id) > 1;
