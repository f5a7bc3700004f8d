-- a char(n) key keeps its padding
-- differs: single-person groups
SELECT c, count(*), count(DISTINCT rider_id) FROM events GROUP BY c;
-- instead
SELECT c, count(*), count(DISTINCT rider_id) FROM events GROUP BY c HAVING count(DISTINCT rider_id) > 1;
