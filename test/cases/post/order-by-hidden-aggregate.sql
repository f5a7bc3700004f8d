-- ORDER BY an aggregate that is not in the list
-- ordered
SELECT kind FROM trips GROUP BY kind ORDER BY avg(fare_pence), kind;
