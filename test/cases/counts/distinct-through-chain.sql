-- persons are counted through the chain of foreign keys
SELECT count(DISTINCT t.rider_id), count(*) FROM complaints c JOIN trips t ON t.trip_id = c.trip_id;
