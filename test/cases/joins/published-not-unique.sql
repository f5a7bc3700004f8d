-- a published table that gives several rows for a row
SELECT count(*), sum(fare_pence) FROM trips t JOIN piers p ON p.pier_id = t.from_pier JOIN tariffs f ON f.zone = p.zone;
