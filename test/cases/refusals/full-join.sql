-- a FULL JOIN
-- refused: join.outer
SELECT count(*) FROM trips t FULL JOIN riders r ON r.rider_id = t.rider_id;
