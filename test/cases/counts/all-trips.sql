-- count(*) of a table is its number of rows
SELECT count(*) FROM trips;
