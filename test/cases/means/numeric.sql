-- avg of a numeric column
SELECT avg(delay_min) FROM trips;
