-- a self-join on the person multiplies a rider's rows
SELECT count(*), count(DISTINCT a.rider_id) FROM trips a JOIN trips b ON a.rider_id = b.rider_id WHERE a.trip_id < b.trip_id;
