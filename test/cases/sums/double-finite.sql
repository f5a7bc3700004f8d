-- a double precision column without its NaN and infinities
SELECT sum(d), avg(d), count(d) FROM events WHERE d BETWEEN -90 AND 90;
