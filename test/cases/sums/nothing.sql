-- a sum over no rows is 0, as noise is added to nothing
-- differs: empty groups
SELECT sum(fare_pence) AS pence, count(*) FROM trips WHERE fare_pence > 5000;
-- instead
SELECT coalesce(sum(fare_pence), 0) AS pence, count(*) FROM trips WHERE fare_pence > 5000;
