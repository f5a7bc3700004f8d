-- a subquery over a published table beside the aggregate
SELECT count(*), (SELECT count(*) FROM piers) AS piers, (SELECT max(price) FROM tariffs) FROM trips;
