-- CASE over constants
SELECT CASE WHEN fare_pence < 300 THEN 'cheap' WHEN fare_pence < 900 THEN 'fair' ELSE 'dear' END AS price, count(*), avg(fare_pence) FROM trips GROUP BY 1;
