-- a self-join on the key is one row each
SELECT count(*), sum(a.fare_pence + b.fare_pence) FROM trips a JOIN trips b USING (trip_id);
