-- sum of a numeric column keeps its decimals
SELECT sum(delay_min) FROM trips;
