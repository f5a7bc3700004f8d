-- a mean of zero
SELECT avg(stars), sum(stars) FROM trips WHERE stars = 0;
