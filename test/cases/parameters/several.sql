-- parameters of several types, one used twice
-- parameter: numeric 12.5
-- parameter: bool true
-- parameter: date 2025-03-01
-- parameter: timestamptz 2025-04-01T10:00:00Z
SELECT count(*), count(*) FILTER (WHERE travelled < $3) FROM trips JOIN riders USING (rider_id) WHERE delay_min > $1 AND concession = $2 AND (travelled >= $3 OR boarded_at > $4);
