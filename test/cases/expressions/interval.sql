-- a timestamp plus an interval
SELECT count(*) FILTER (WHERE boarded_at + interval '36 hours' > timestamptz '2025-03-01 00:00+00'), count(*) FILTER (WHERE travelled + interval '1 month' < '2025-03-15') FROM trips;
