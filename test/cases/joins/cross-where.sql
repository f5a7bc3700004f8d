-- CROSS JOIN and WHERE
SELECT count(*) FROM riders r CROSS JOIN trips t WHERE r.rider_id = t.rider_id AND NOT r.concession;
