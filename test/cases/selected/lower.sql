-- a text function as key
-- differs: single-person groups
SELECT lower(btrim(note)) AS n, count(*) FROM trips GROUP BY 1;
-- instead
SELECT lower(btrim(note)) AS n, count(*) FROM trips GROUP BY 1 HAVING count(DISTINCT rider_id) > 1;
