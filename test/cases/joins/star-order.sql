-- a renaming alias and a star follow the order of the visible table
SELECT count(*), sum(j.pence), count(j.x) FROM (SELECT * FROM complaints AS c(id, trip, x, s, d, r)) AS k(id, trip, x, s, d, r) JOIN (SELECT trip_id, fare_pence AS pence, 1 AS x FROM trips) AS j ON j.trip_id = k.trip WHERE k.s > 2 AND k.d > date '2025-02-01' AND k.x <> 'crew';
