-- a topic that one rider has is not shown
-- differs: single-person groups
SELECT topic, count(*) FROM complaints GROUP BY topic;
-- instead
SELECT topic, count(*) FROM complaints JOIN trips USING (trip_id) GROUP BY topic HAVING count(DISTINCT rider_id) > 1;
