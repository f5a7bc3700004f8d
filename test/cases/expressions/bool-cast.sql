-- a condition as a number
SELECT sum((stars > 0)::int), avg((kind = 'single')::int) FROM trips;
