-- count(DISTINCT person) counts each rider once
SELECT count(DISTINCT rider_id) FROM trips;
