-- a numeric column of no declared scale, on its step
SELECT sum(n), count(n) FROM events WHERE n > -1000 AND n < 1000;
