-- arithmetic on a date parameter
-- parameter: date 2025-05-01
SELECT count(*) FROM trips WHERE travelled BETWEEN $1::date - 30 AND $1::date + 30;
