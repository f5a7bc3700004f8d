-- a comma and WHERE
SELECT count(*), avg(t.stars) FROM trips t, riders r WHERE t.rider_id = r.rider_id AND r.newsletter;
