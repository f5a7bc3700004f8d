-- days and piers
SELECT d, p.name, count(t.trip_id) FROM generate_series(date '2025-02-03', date '2025-02-05', interval '1 day') AS d CROSS JOIN piers p LEFT JOIN trips t ON t.travelled = d AND t.from_pier = p.pier_id GROUP BY d, p.name;
