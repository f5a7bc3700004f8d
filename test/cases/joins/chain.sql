-- complaints with their trips and riders
SELECT count(*), avg(c.severity), count(DISTINCT r.rider_id) FROM complaints c JOIN trips t ON t.trip_id = c.trip_id JOIN riders r ON r.rider_id = t.rider_id WHERE r.concession OR t.stars < 0;
