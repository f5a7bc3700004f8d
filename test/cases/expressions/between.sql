-- BETWEEN over numbers, dates and text
SELECT count(*) FILTER (WHERE fare_pence BETWEEN 100 AND 500), count(*) FILTER (WHERE travelled BETWEEN '2025-02-01' AND '2025-02-28'), count(*) FILTER (WHERE note NOT BETWEEN 'a' AND 'm') FROM trips;
