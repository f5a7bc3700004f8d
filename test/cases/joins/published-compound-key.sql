-- a published table joined on a key of two columns
SELECT count(*), sum(t.stars) FROM trips t JOIN piers p ON p.pier_id = t.from_pier JOIN tariffs f ON f.zone = p.zone AND f.season = 'winter';
