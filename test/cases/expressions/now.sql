-- now() minus an interval
SELECT count(*) FROM riders WHERE last_seen > now() - interval '20 hours';
