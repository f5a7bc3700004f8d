-- a sum and a mean with NULLs replaced
SELECT sum(coalesce(delay_min, 0)), avg(coalesce(weight_kg, 0)), avg(coalesce(fare_pence, 100)) FROM trips;
