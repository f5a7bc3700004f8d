-- the people a published row lacks
-- refused: block.shape
SELECT count(*) FROM riders r WHERE NOT EXISTS (SELECT 1 FROM trips t WHERE t.rider_id = r.rider_id);
