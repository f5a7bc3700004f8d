-- a constant key beside another
SELECT 'ferry' AS what, kind, count(*) FROM trips GROUP BY 1, 2;
