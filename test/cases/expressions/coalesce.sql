-- coalesce over numbers
SELECT sum(coalesce(fare_pence, 0)), avg(coalesce(stars, 0)), sum(coalesce(delay_min, 1.5)) FROM trips;
