-- a scalar subquery over a block within a published query
-- ordered
SELECT p.name, (SELECT count(*) FROM trips) AS trips FROM piers p ORDER BY p.pier_id;
