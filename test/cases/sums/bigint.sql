-- sum of a bigint is numeric
SELECT sum(i8) FROM events WHERE i8 BETWEEN -1000000000 AND 1000000000;
