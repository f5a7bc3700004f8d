-- a note that one rider wrote is not shown
-- differs: single-person groups
SELECT note, count(*), sum(fare_pence), avg(stars), count(DISTINCT rider_id) FROM trips GROUP BY note;
-- instead
SELECT note, count(*), sum(fare_pence), avg(stars), count(DISTINCT rider_id) FROM trips GROUP BY note HAVING count(DISTINCT rider_id) > 1;
