-- parameters and results in binary
-- binary
-- parameter: int4 3
-- parameter: text late
-- parameter: date 2025-02-01
-- parameter: timestamptz 2025-03-01T00:00:00Z
SELECT count(*) FROM trips WHERE from_pier = $1 OR note = $2 OR travelled = $3 OR boarded_at < $4;
