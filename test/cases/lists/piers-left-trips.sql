-- piers LEFT JOIN trips: every pier, empty ones with 0
SELECT p.name, count(t.trip_id) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY p.name;
