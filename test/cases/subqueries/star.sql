-- a derived table with a star
SELECT count(*), avg(fare_pence) FROM (SELECT * FROM trips WHERE kind <> 'single') AS t;
