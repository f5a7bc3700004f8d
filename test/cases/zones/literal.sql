-- a literal without a zone is read in the session's
SET TimeZone = 'America/Los_Angeles';
SELECT count(*) FROM trips WHERE boarded_at >= '2025-02-01' AND boarded_at < '2025-02-02 12:00';
SET TimeZone = 'UTC';
SELECT count(*) FROM trips WHERE boarded_at >= '2025-02-01' AND boarded_at < '2025-02-02 12:00';
