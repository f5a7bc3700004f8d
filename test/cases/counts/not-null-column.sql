-- count(x) of a column without NULLs counts rows
SELECT count(travelled), count(kind) FROM trips;
