-- weeks
-- differs: empty groups
-- extra: ["2025-06-23 00:00:00+00", "0"]
-- extra: ["2025-06-30 00:00:00+00", "0"]
SET TimeZone = 'UTC';
SELECT date_trunc('week', travelled), count(*) FROM trips GROUP BY 1;
