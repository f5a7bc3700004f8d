-- the same as a RIGHT JOIN
SELECT count(*), count(t.trip_id) FROM trips t RIGHT JOIN riders r ON t.rider_id = r.rider_id;
