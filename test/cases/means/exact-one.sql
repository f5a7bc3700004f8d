-- a mean of equal values keeps PostgreSQL's digits
SELECT avg(stars) FROM trips WHERE stars = 1;
