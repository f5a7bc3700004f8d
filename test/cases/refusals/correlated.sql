-- an aggregate for each row of a published table
-- refused: block.correlated
SELECT p.name, (SELECT count(*) FROM trips t WHERE t.from_pier = p.pier_id) FROM piers p;
