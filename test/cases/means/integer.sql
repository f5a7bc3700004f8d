-- avg of integers is numeric with PostgreSQL's own number of digits
SELECT avg(fare_pence), avg(stars) FROM trips;
