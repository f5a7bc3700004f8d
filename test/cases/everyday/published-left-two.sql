-- a list, and two private tables behind it
SELECT p.name, count(t.trip_id), count(DISTINCT t.rider_id) FROM piers p LEFT JOIN (trips t JOIN riders r ON r.rider_id = t.rider_id AND r.concession) ON t.from_pier = p.pier_id GROUP BY p.name;
