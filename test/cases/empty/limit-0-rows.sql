-- LIMIT 0 over rows too
-- free
SELECT * FROM riders LIMIT 0;
