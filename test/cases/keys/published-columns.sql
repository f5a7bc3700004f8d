-- several columns of a published table, one by way of its primary key
-- differs: empty groups
-- extra: ["6", "Nowhere Jetty", "3", "0"]
SELECT p.pier_id, p.name, p.zone, count(*) FROM trips t JOIN piers p ON p.pier_id = t.from_pier GROUP BY p.pier_id;
