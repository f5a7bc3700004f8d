-- sum of a double precision column on its grid
SELECT sum(weight_kg) FROM trips;
