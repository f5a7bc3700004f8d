-- sum of a real column leaves NaN and infinity to the condition
SELECT sum(r), count(r) FROM events WHERE r < 50 AND r > -50;
