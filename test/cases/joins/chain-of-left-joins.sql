-- two LEFT JOINs, the second on the row that the first one found
SELECT count(*), count(t.trip_id), count(c.topic) FROM riders r LEFT JOIN trips t USING (rider_id) LEFT JOIN complaints c USING (trip_id);
