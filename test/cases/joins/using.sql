-- JOIN USING the person
SELECT count(*), count(DISTINCT rider_id) FROM trips JOIN riders USING (rider_id) WHERE district = 'Eastquay';
