-- WHERE false over rows of every type
-- free
SELECT * FROM events WHERE false;
