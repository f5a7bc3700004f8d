-- a condition in ON keeps every pier
SELECT p.name, count(t.trip_id) FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id AND t.kind = 'single' GROUP BY p.name;
