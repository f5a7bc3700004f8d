-- months of a time zone east of Greenwich
-- differs: empty groups
-- extra: ["2025-07-01 00:00:00+12", "0"]
SET TimeZone = 'Pacific/Auckland';
SELECT date_trunc('month', boarded_at), count(*) FROM trips GROUP BY 1;
