-- extract in a condition and a sum
SELECT count(*) FILTER (WHERE extract(month FROM travelled) = 3), sum(extract(day FROM travelled)), count(*) FILTER (WHERE date_part('isodow', travelled) > 5) FROM trips;
