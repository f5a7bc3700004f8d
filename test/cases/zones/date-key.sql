-- a date compared with a timestamptz follows the zone
SET TimeZone = 'Pacific/Kiritimati';
SELECT count(*) FILTER (WHERE boarded_at >= date '2025-03-01'), count(*) FILTER (WHERE travelled > boarded_at) FROM trips;
