-- an aggregate that has no bound
-- refused: block.aggregate
SELECT string_agg(note, ',') FROM trips;
