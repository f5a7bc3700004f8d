-- WHERE 1 = 0, as tools ask
-- free
SELECT t.*, r.district FROM trips t JOIN riders r USING (rider_id) WHERE 1 = 0;
