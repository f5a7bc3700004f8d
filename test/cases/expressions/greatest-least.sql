-- greatest and least skip NULLs
SELECT sum(greatest(fare_pence, 400)), sum(least(stars, 2)), sum(greatest(stars, 0, -1)), sum(least(fare_pence, stars)) FROM trips;
