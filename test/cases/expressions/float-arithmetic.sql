-- arithmetic over a double precision column
SELECT sum(weight_kg * 2), sum(weight_kg + stars), avg(weight_kg / 2) FROM trips;
