-- a condition as key; its NULL group has nothing to add up
-- differs: empty groups
SELECT stars > 0 AS liked, count(*), sum(stars) FROM trips GROUP BY stars > 0;
-- instead
SELECT stars > 0 AS liked, count(*), coalesce(sum(stars), 0) AS sum FROM trips GROUP BY stars > 0;
