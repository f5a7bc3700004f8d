-- count(1) is count(*)
SELECT count(1), sum(1), count('x'), count(NULL) FROM trips;
