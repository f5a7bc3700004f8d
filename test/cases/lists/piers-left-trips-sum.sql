-- a sum over no trips is 0 there
-- differs: padding
SELECT p.pier_id, p.name, count(t.trip_id) AS trips, sum(t.fare_pence) AS pence, avg(t.stars) AS stars FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY p.pier_id;
-- instead
SELECT p.pier_id, p.name, count(t.trip_id) AS trips, coalesce(sum(t.fare_pence), 0) AS pence, avg(t.stars) AS stars FROM piers p LEFT JOIN trips t ON t.from_pier = p.pier_id GROUP BY p.pier_id;
