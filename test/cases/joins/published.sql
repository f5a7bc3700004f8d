-- a published table joined by its key
SELECT count(*), count(p.zone) FROM trips JOIN piers p ON p.pier_id = from_pier WHERE p.zone = 2;
