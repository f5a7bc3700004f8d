-- coalesce around a sum over the private side of a list
SELECT p.name, coalesce(sum(t.fare_pence), 0) AS pence FROM piers p LEFT JOIN trips t ON t.to_pier = p.pier_id GROUP BY p.name;
