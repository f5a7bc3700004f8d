-- SELECT DISTINCT is a list of groups
-- differs: single-person groups
SELECT DISTINCT topic, resolved FROM complaints;
-- instead
SELECT topic, resolved FROM complaints JOIN trips USING (trip_id) GROUP BY 1, 2 HAVING count(DISTINCT rider_id) > 1;
