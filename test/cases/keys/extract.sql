-- extract gives a numeric key
SELECT extract(dow FROM travelled) AS dow, count(*), count(DISTINCT rider_id) FROM trips GROUP BY extract(dow FROM travelled);
