-- the month as a date
SET TimeZone = 'UTC';
SELECT date_trunc('month', travelled)::date AS month, count(*) FROM trips GROUP BY 1;
