-- a FILTER over the private side of a list
SELECT p.pier_id, count(t.trip_id) FILTER (WHERE t.stars > 0) FROM piers p LEFT JOIN trips t ON t.to_pier = p.pier_id GROUP BY p.pier_id;
