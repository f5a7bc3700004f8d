-- WHERE on the published side names fewer groups
SELECT p.name, count(t.trip_id) FROM piers p LEFT JOIN trips t ON t.to_pier = p.pier_id WHERE p.zone > 1 GROUP BY p.name;
