-- avg of a double precision column
SELECT avg(weight_kg) FROM trips;
