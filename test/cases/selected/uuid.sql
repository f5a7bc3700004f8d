-- a uuid key
-- differs: single-person groups
SELECT u, count(*) FROM events GROUP BY u;
-- instead
SELECT u, count(*) FROM events GROUP BY u HAVING count(DISTINCT rider_id) > 1;
