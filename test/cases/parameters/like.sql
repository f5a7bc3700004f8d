-- a parameter as pattern
-- parameter: text %late%
SELECT count(*) FROM trips WHERE note ILIKE $1;
