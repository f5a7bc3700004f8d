-- a time of day
-- differs: single-person groups
SELECT tm, count(*) FROM events GROUP BY tm;
-- instead
SELECT tm, count(*) FROM events GROUP BY tm HAVING count(DISTINCT rider_id) > 1;
