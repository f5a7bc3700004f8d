-- trips LEFT JOIN piers keeps trips without a pier
SELECT count(*), count(p.name), count(*) FILTER (WHERE p.pier_id IS NULL) FROM trips t LEFT JOIN piers p ON p.pier_id = t.from_pier;
