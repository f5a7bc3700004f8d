-- the hour of day in a time zone
SET TimeZone = 'Asia/Kolkata';
SELECT extract(hour FROM boarded_at) AS h, count(*) FROM trips GROUP BY 1 HAVING count(*) > 0;
