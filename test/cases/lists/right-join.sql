-- the same as a RIGHT JOIN
SELECT p.name, count(t.rider_id), count(DISTINCT t.rider_id) FROM trips t RIGHT JOIN piers p ON t.from_pier = p.pier_id GROUP BY p.name;
