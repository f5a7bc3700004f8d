-- date_trunc of a timestamptz over its clamp
-- differs: empty groups
-- extra: ["2025-07-01 00:00:00+00", "0"]
SET TimeZone = 'UTC';
SELECT date_trunc('month', boarded_at) AS month, count(*) FROM trips GROUP BY 1;
