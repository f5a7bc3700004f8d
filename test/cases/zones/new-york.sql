-- days around a clock change
SET TimeZone = 'America/New_York';
SELECT count(*) FILTER (WHERE date_trunc('day', boarded_at) = timestamptz '2025-03-09'), count(*) FILTER (WHERE extract(hour FROM boarded_at) = 2), count(*) FILTER (WHERE boarded_at::date = '2025-03-09') FROM trips;
