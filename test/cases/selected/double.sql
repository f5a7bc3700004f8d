-- a double precision key, NaN and infinities among those of one person
-- differs: single-person groups
SELECT d, count(*) FROM events GROUP BY d;
-- instead
SELECT d, count(*) FROM events GROUP BY d HAVING count(DISTINCT rider_id) > 1;
