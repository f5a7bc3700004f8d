-- a published derived table
SELECT count(*), sum(t.fare_pence) FROM trips t JOIN (SELECT pier_id AS p, zone * 10 AS z FROM piers WHERE roofed) AS q ON q.p = t.to_pier WHERE q.z > 10;
