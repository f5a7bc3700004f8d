-- floor and ceil of a double precision column
SELECT sum(floor(weight_kg)), sum(ceil(weight_kg)), sum(trunc(weight_kg)) FROM trips;
