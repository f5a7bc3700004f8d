-- a mean over no rows is NULL
SELECT avg(fare_pence), avg(weight_kg), count(*) FROM trips WHERE fare_pence > 5000;
