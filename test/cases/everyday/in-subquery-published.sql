-- a condition on a subquery over a published table
-- refused: block.shape
SELECT count(*) FROM trips WHERE from_pier IN (SELECT pier_id FROM piers WHERE zone = 1);
