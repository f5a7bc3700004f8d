-- an expression over published columns
SELECT p.zone * 10 AS z, p.roofed, count(*) FROM trips t JOIN piers p ON p.pier_id = t.from_pier WHERE p.zone < 3 GROUP BY 1, 2;
