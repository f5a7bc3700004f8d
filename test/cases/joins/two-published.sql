-- one published table joined twice
SELECT count(*), sum(fare_pence) FROM trips t JOIN piers a ON a.pier_id = t.from_pier JOIN piers b ON b.pier_id = t.to_pier WHERE a.zone < b.zone;
