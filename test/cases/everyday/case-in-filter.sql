-- CASE as a condition
SELECT count(*) FROM trips WHERE CASE WHEN kind = 'single' THEN stars > 0 ELSE fare_pence > 500 END;
