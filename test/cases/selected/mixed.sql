-- a declared and an undeclared key
-- differs: single-person groups
SELECT kind, note, count(*) FROM trips GROUP BY kind, note;
-- instead
SELECT kind, note, count(*) FROM trips GROUP BY kind, note HAVING count(DISTINCT rider_id) > 1;
