-- NATURAL JOIN on the one shared column
SELECT count(*) FROM trips NATURAL JOIN riders WHERE birth_year > 1970;
