-- a mean above ten thousand has fewer digits
SELECT avg(fare_pence * 1000) FROM trips;
