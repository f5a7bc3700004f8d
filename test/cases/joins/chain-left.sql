-- trips LEFT JOIN their complaints
SELECT count(*), count(c.complaint_id), sum(c.severity) FROM trips t LEFT JOIN complaints c ON c.trip_id = t.trip_id;
