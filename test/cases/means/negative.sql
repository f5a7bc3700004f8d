-- a negative mean
SELECT avg(stars), avg(-fare_pence) FROM trips WHERE stars < 0;
